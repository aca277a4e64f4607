import fs from 'node:fs';
import path from 'node:path';
import { SerialPort } from 'serialport';
import {
  type PortWarning,
  portWarnings,
  readLine,
  type SystemRoots,
  systemRoots,
} from './portWarnings.js';
import { list, realPath, stableNames } from './serialPaths.js';

export interface PortDescription {
  /** The path to put into a rig file: the stable one where there is one. */
  readonly path: string;
  readonly device: string;
  /** The path stays the same over replugging and restarts. */
  readonly stable: boolean;
  readonly maker: string | null;
  readonly product: string | null;
  readonly serialNumber: string | null;
  /** USB vendor and product number, in hex: `0403:6001`. */
  readonly usb: string | null;
  /** The program that has it open, as far as this user may see; null: none seen. */
  readonly usedBy: { readonly pid: number; readonly program: string } | null;
  readonly warnings: readonly PortWarning[];
}

/** Every serial device that is connected now. */
export async function describePorts(): Promise<PortDescription[]> {
  return process.platform === 'linux' ? describeLinux(systemRoots) : describeElsewhere();
}

/** The same from Linux's own view of its devices, which tests lay out in a folder. */
export function describeLinux(roots: SystemRoots): PortDescription[] {
  const stable = new Map([...stableNames(roots.dev)].map(([link, device]) => [device, link]));
  const users = usersOf(roots);
  return list(path.join(roots.sys, 'class/tty'))
    .filter((name) => isDevice(name, roots))
    .map((name) => {
      const device = path.join(roots.dev, name);
      const link = stable.get(realPath(device) ?? device);
      const facts = usbFacts(name, roots);
      return {
        path: link ?? device,
        device,
        // A UART on the board itself keeps its number.
        stable: link !== undefined || facts.usb === null,
        ...facts,
        usedBy: users.get(device) ?? null,
        warnings: portWarnings(device, roots),
      };
    });
}

/** Hardware behind it, and a UART really there: the kernel shows four ttyS on any machine. */
function isDevice(name: string, roots: SystemRoots): boolean {
  const at = path.join(roots.sys, 'class/tty', name);
  if (!fs.existsSync(path.join(at, 'device'))) return false;
  return readLine(path.join(at, 'type')) !== '0';
}

/** Climbs from the terminal to the USB device that it belongs to. */
function usbFacts(name: string, roots: SystemRoots) {
  const top = realPath(roots.sys) ?? roots.sys;
  let at = realPath(path.join(roots.sys, 'class/tty', name, 'device'));
  while (at?.startsWith(top) && at !== top) {
    const vendor = readLine(path.join(at, 'idVendor'));
    if (vendor !== undefined) {
      return {
        maker: readLine(path.join(at, 'manufacturer')) ?? null,
        product: readLine(path.join(at, 'product')) ?? null,
        serialNumber: readLine(path.join(at, 'serial')) ?? null,
        usb: `${vendor}:${readLine(path.join(at, 'idProduct')) ?? '?'}`,
      };
    }
    at = path.dirname(at);
  }
  return { maker: null, product: null, serialNumber: null, usb: null };
}

/** Which program has which device open. Other users' programs are seen by root only. */
function usersOf(roots: SystemRoots): Map<string, { pid: number; program: string }> {
  const users = new Map<string, { pid: number; program: string }>();
  for (const pid of list(roots.proc).filter((name) => /^\d+$/.test(name))) {
    const folder = path.join(roots.proc, pid, 'fd');
    for (const fd of list(folder)) {
      const target = linkTarget(path.join(folder, fd));
      if (target === undefined || !target.startsWith(path.join(roots.dev, 'tty'))) continue;
      const program = readLine(path.join(roots.proc, pid, 'comm')) ?? 'a program';
      users.set(target, { pid: Number(pid), program });
    }
  }
  return users;
}

function linkTarget(file: string): string | undefined {
  try {
    return fs.readlinkSync(file);
  } catch {
    return undefined;
  }
}

async function describeElsewhere(): Promise<PortDescription[]> {
  const ports = await SerialPort.list();
  return ports.map((port) => ({
    path: port.path,
    device: port.path,
    stable: process.platform === 'win32',
    maker: port.manufacturer ?? null,
    product: null,
    serialNumber: port.serialNumber ?? null,
    usb: port.vendorId === undefined ? null : `${port.vendorId}:${port.productId ?? '?'}`,
    usedBy: null,
    warnings: [],
  }));
}
