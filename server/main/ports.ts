import { Command } from 'commander';
import { describePorts, type PortDescription } from '../link/describePorts.js';
import { grabberWarnings, type PortWarning } from '../link/portWarnings.js';

/** `lapwing ports`: what is connected, in words, and what may go wrong with it. */
export function portsCommand(): Command {
  return new Command('ports')
    .description('list the serial devices that a board could be on, with warnings')
    .option('--json', 'print JSON instead of words')
    .action(async (options: { json?: boolean }) => {
      const ports = await describePorts();
      const general = grabberWarnings();
      const text = options.json
        ? JSON.stringify({ ports, warnings: general }, null, 2)
        : portsInWords(ports, general);
      console.log(text);
    });
}

/** What `lapwing ports` prints. */
export function portsInWords(
  ports: readonly PortDescription[],
  general: readonly PortWarning[],
): string {
  const parts =
    ports.length === 0
      ? ['No serial device is connected. Plug the board in, and check that the cable carries data.']
      : ports.map(portInWords);
  if (general.length > 0) parts.push(general.flatMap(warningLines).join('\n'));
  return parts.join('\n\n');
}

function portInWords(port: PortDescription): string {
  const lines = [port.path, `  ${whatItIs(port)}`];
  if (port.path !== port.device) lines.push(`  now at ${port.device}`);
  else if (!port.stable) lines.push('  this path may change when it is plugged in again');
  const { usedBy } = port;
  lines.push(usedBy === null ? '  not in use' : `  in use by ${usedBy.program} (${usedBy.pid})`);
  lines.push(...port.warnings.flatMap(warningLines).map((line) => `  ${line}`));
  return lines.join('\n');
}

function whatItIs(port: PortDescription): string {
  const name = [port.maker, port.product].filter((part) => part !== null).join(' ');
  const details = [
    port.usb === null ? null : `USB ${port.usb}`,
    port.serialNumber === null ? null : `serial number ${port.serialNumber}`,
  ].filter((part) => part !== null);
  if (name === '') return details.length === 0 ? 'a serial port' : details.join(', ');
  return details.length === 0 ? name : `${name} (${details.join(', ')})`;
}

function warningLines(warning: PortWarning): string[] {
  return [`Warning: ${warning.text}`, `  ${warning.remedy}`];
}
