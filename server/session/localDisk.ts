import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';

/**
 * Kinds of file system that reach over a network or through a program: a write there can hang for
 * as long as they please. Numbers: statfs(2) and linux/magic.h; a FUSE mount (sshfs and the folders
 * of cloud stores) is one number for all.
 */
const REMOTE: ReadonlyMap<number, string> = new Map([
  [0x6969, 'NFS'],
  [0xff534d42, 'CIFS'],
  [0xfe534d42, 'SMB'],
  [0x517b, 'SMB'],
  [0x01021997, '9P'],
  [0x5346414f, 'AFS'],
  [0x73757245, 'Coda'],
  [0x00c36400, 'Ceph'],
  [0x0bd00bd0, 'Lustre'],
  [0x65735546, 'FUSE'],
]);
/** Block devices read through a program in user space, with a driver of their own kind: local. */
const LOCAL_FUSE = new Set(['fuseblk']);

/**
 * What a synchronising program leaves at the top of a folder it minds, by its look, since there are
 * many of them: `.sync`, `.synced`, `.sync_1f.db`, `.sync-exclude.lst`. A lab whose program leaves
 * nothing can put a `.synced` there itself. `common practice, no source`.
 */
const SYNC_MARK = /^\.[_~]?sync(ed|ing)?($|[._-])/i;

/**
 * Why nothing should be recorded live below `folder`; undefined when it looks like a local disk.
 * `typeOf` gives a file system's number as statfs(2) does.
 */
export function whyNotLocal(
  folder: string,
  typeOf: (folder: string) => number = (at) => fs.statfsSync(at).type,
): string | undefined {
  const real = fs.realpathSync.native(folder);
  if (real.startsWith('\\\\')) return 'it is a network share';
  const kind = REMOTE.get(typeOf(real) >>> 0);
  if (kind !== undefined && !LOCAL_FUSE.has(mountKind(real)))
    return `it is on a ${kind} file system`;
  for (let at = real; ; at = path.dirname(at)) {
    const mark = syncMark(at);
    if (mark !== undefined) return `${at} is synchronised to another machine (${mark})`;
    if (path.dirname(at) === at) return undefined;
  }
}

function syncMark(folder: string): string | undefined {
  // The top of the disk and of a home hold settings of programs, not only what they mind.
  if (path.dirname(folder) === folder || folder === os.homedir()) return undefined;
  try {
    const mark = fs.readdirSync(folder).find((name) => SYNC_MARK.test(name));
    return mark === undefined ? undefined : `it holds \`${mark}\``;
  } catch {
    return undefined;
  }
}

/** The type of the innermost mount that holds the folder, as the kernel names it. */
function mountKind(folder: string): string {
  let kind = '';
  let longest = -1;
  let mounts = '';
  try {
    mounts = fs.readFileSync('/proc/self/mounts', 'utf8');
  } catch {
    return '';
  }
  for (const line of mounts.split('\n')) {
    const [, at, type] = line.split(' ');
    if (at === undefined || type === undefined) continue;
    // fstab(5): a space in a path is written \040.
    const mount = at.replace(/\\(\d{3})/g, (_, code) =>
      String.fromCharCode(Number.parseInt(code, 8)),
    );
    const holds = folder === mount || folder.startsWith(mount === '/' ? '/' : mount + '/');
    if (holds && mount.length > longest) {
      longest = mount.length;
      kind = type;
    }
  }
  return kind;
}

/** Bytes that this user may still write on the disk that holds the folder. */
export function diskFree(folder: string): number {
  const { bavail, bsize } = fs.statfsSync(folder);
  return bavail * bsize;
}
