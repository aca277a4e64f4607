import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { describeLinux } from '../../server/link/describePorts.js';
import { editsBetween, nearestNames } from '../../server/link/nearestNames.js';
import { groupOf, openError } from '../../server/link/openError.js';
import { grabberWarnings, type SystemRoots } from '../../server/link/portWarnings.js';
import { stableName } from '../../server/link/resolvePort.js';
import { serialPaths } from '../../server/link/serialPaths.js';
import { portsInWords } from '../../server/main/ports.js';

/**
 * A kernel's view of its devices, as real files in a folder of its own. The places and names of
 * the files are those of Linux: Documentation/ABI/testing/sysfs-bus-usb, sysfs-tty, and
 * drivers/usb/serial/ftdi_sio.c (latency_timer). (from memory)
 */
class FakeSystem implements SystemRoots {
  readonly root = fs.mkdtempSync(path.join(os.tmpdir(), 'lapwing-sys-'));
  readonly dev = path.join(this.root, 'dev');
  readonly sys = path.join(this.root, 'sys');
  readonly proc = path.join(this.root, 'proc');
  readonly forbidden = new Set<string>();
  readonly canOpen = (device: string) => !this.forbidden.has(device);

  write(file: string, text = ''): string {
    const full = path.join(this.root, file);
    fs.mkdirSync(path.dirname(full), { recursive: true });
    fs.writeFileSync(full, text);
    return full;
  }

  link(file: string, target: string): string {
    const full = path.join(this.root, file);
    fs.mkdirSync(path.dirname(full), { recursive: true });
    fs.symlinkSync(target, full);
    return full;
  }

  /** A USB adapter at `dev/NAME`, two levels below the device that carries its description. */
  adapter(name: string, facts: Record<string, string>): string {
    const usb = `sys/devices/pci0/usb1/${name}-port`;
    for (const [file, text] of Object.entries(facts)) this.write(`${usb}/${file}`, `${text}\n`);
    fs.mkdirSync(path.join(this.root, usb, 'if0', 'tty'), { recursive: true });
    this.link(`sys/class/tty/${name}/device`, path.join(this.root, usb, 'if0', 'tty'));
    return this.write(`dev/${name}`);
  }
}

let system: FakeSystem;
beforeEach(() => {
  system = new FakeSystem();
});
afterEach(() => fs.rmSync(system.root, { recursive: true }));

const ADAPTER = {
  idVendor: '0403',
  idProduct: '6001',
  manufacturer: 'Some Maker',
  product: 'USB UART',
  serial: 'A1B2',
};

describe('describing the serial ports', () => {
  it('names maker, product, stable path and who has it open', () => {
    const device = system.adapter('ttyUSB0', ADAPTER);
    const stable = system.link('dev/serial/by-id/usb-Some_UART-if00', device);
    system.write('proc/42/comm', 'monitor\n');
    system.link('proc/42/fd/7', device);
    const ports = describeLinux(system);
    expect(ports).toEqual([
      {
        path: stable,
        device,
        stable: true,
        maker: 'Some Maker',
        product: 'USB UART',
        serialNumber: 'A1B2',
        usb: '0403:6001',
        usedBy: { pid: 42, program: 'monitor' },
        warnings: [],
      },
    ]);
    expect(portsInWords(ports, [])).toBe(
      [
        stable,
        '  Some Maker USB UART (USB 0403:6001, serial number A1B2)',
        `  now at ${device}`,
        '  in use by monitor (42)',
      ].join('\n'),
    );
  });

  it('leaves out terminals without hardware and UARTs that are not fitted', () => {
    system.write('sys/class/tty/tty1/dev', '4:1');
    system.write('sys/class/tty/ttyS0/type', '0\n');
    fs.mkdirSync(path.join(system.sys, 'class/tty/ttyS0/device'));
    system.write('sys/class/tty/ttyS1/type', '4\n');
    fs.mkdirSync(path.join(system.sys, 'class/tty/ttyS1/device'));
    const ports = describeLinux(system);
    expect(ports.map((port) => path.basename(port.device))).toEqual(['ttyS1']);
    expect(ports[0]!.stable).toBe(true);
    expect(portsInWords(ports, [])).toContain('a serial port\n  not in use');
  });

  it('says when a path may change', () => {
    system.adapter('ttyUSB0', ADAPTER);
    const words = portsInWords(describeLinux(system), []);
    expect(words).toContain('this path may change when it is plugged in again');
  });

  it('warns of an FTDI latency timer above 1 ms, and of nothing at 1 ms', () => {
    system.adapter('ttyUSB0', ADAPTER);
    system.adapter('ttyUSB1', ADAPTER);
    system.write('sys/bus/usb-serial/devices/ttyUSB0/latency_timer', '16\n');
    system.write('sys/bus/usb-serial/devices/ttyUSB1/latency_timer', '1\n');
    const [slow, quick] = describeLinux(system);
    expect(slow!.warnings.map((warning) => warning.text)).toEqual([
      'The FTDI adapter holds short frames back for 16 ms (latency_timer).',
    ]);
    expect(slow!.warnings[0]!.remedy).toContain('echo 1 | sudo tee');
    expect(quick!.warnings).toEqual([]);
  });

  it('warns of missing permission, with the group to join', () => {
    const device = system.adapter('ttyACM0', ADAPTER);
    system.forbidden.add(device);
    const words = portsInWords(describeLinux(system), []);
    expect(words).toContain(`Warning: This user may not open ${device}`);
    expect(words).toContain('sudo usermod -aG dialout $USER');
  });

  it('warns of programs that open new devices unasked', () => {
    system.write('proc/1/comm', 'systemd\n');
    expect(grabberWarnings(system)).toEqual([]);
    system.write('proc/300/comm', 'ModemManager\n');
    const [warning] = grabberWarnings(system);
    expect(warning!.text).toContain('ModemManager is running');
    expect(portsInWords([], [warning!])).toMatch(
      /^No serial device is connected[\s\S]*ModemManager/,
    );
  });

  it('says so where nothing is connected at all', () => {
    expect(describeLinux(system)).toEqual([]);
  });
});

describe('finding a port', () => {
  it('lists the stable paths before the plain ones', () => {
    const device = system.write('dev/ttyUSB0');
    system.write('dev/null');
    const stable = system.link('dev/serial/by-id/usb-A', device);
    expect(serialPaths(system.dev)).toEqual([stable, device]);
    expect(stableName(device, system.dev)).toBe(stable);
    expect(stableName(system.write('dev/ttyUSB1'), system.dev)).toBeUndefined();
  });

  it('names the paths nearest to a wrong one', () => {
    const paths = ['/dev/ttyACM0', '/dev/ttyUSB1', '/dev/serial/by-id/usb-A'];
    expect(nearestNames('/dev/ttyUSB0', paths, 2)).toEqual(['/dev/ttyUSB1', '/dev/ttyACM0']);
    // The textbook pair of Levenshtein's distance: two letters replaced and one put in.
    expect(editsBetween('kitten', 'sitting')).toBe(3);
    expect(editsBetween('', 'abc')).toBe(3);
  });

  it('tells the group that owns a device by its name, or its number where it has none', () => {
    const device = system.write('dev/ttyUSB0');
    const { gid } = fs.statSync(device);
    const groups = system.write('etc/group', `other:x:9999:\nlines:x:${gid}:\n`);
    expect(groupOf(device, groups)).toBe('lines');
    expect(groupOf(device, system.write('etc/empty'))).toBe(String(gid));
  });

  it('tells a device that is not there from one that cannot be a serial port', () => {
    const missing = openError(path.join(system.dev, 'ttyUSB9'), new Error('whatever'));
    expect(missing.code).toBe('LINK_PORT_MISSING');
    const file = system.write('dev/notes.txt');
    const text = 'Error: Inappropriate ioctl for device setting custom baud rate of 500000';
    const odd = openError(file, new Error(text));
    expect(odd.code).toBe('LINK_OPEN_FAILED');
    expect(odd.message).toContain('Inappropriate ioctl');
  });

  it('names the group to join where opening was forbidden', () => {
    const device = system.write('dev/ttyUSB0');
    const forbidden = openError(device, new Error('Error: Permission denied, cannot open'));
    expect(forbidden.code).toBe('LINK_PERMISSION');
    expect(forbidden.message).toContain(`${device}, which belongs to the group`);
    expect(forbidden.remedy).toContain('dialout');
  });
});
