const LONGEST_PATH = 200;

/**
 * The path of a file beside or below another one. Rules do no I/O and know no file system: whoever
 * reads must still refuse links that lead elsewhere.
 * @returns the path, or in plain words why the name is refused
 */
export function pathBeside(
  owner: string,
  name: string,
  ending: readonly string[],
): { readonly path: string } | { readonly why: string } {
  if (name.length > LONGEST_PATH) return { why: 'the file name is too long' };
  if (/[\\:]/.test(name))
    return { why: 'only `/` divides folders, and no drive or scheme may be named' };
  if (name.startsWith('/') || name.startsWith('~')) {
    return { why: 'the file must lie in the folder of this one or below' };
  }
  const parts = name.split('/');
  if (parts.some((part) => part === '..')) {
    return { why: '`..` leads out of the folder: the file must lie in it or below' };
  }
  for (const part of parts) {
    if (!/^[A-Za-z0-9_][A-Za-z0-9_. -]*$/.test(part) || /[. ]$/.test(part)) {
      return {
        why: 'a file name is letters, digits, `_`, `-`, spaces and dots, beginning with a letter or digit',
      };
    }
    // Names that stand for devices on Windows, whatever their ending.
    if (/^(con|prn|aux|nul|com\d|lpt\d)(\.|$)/i.test(part))
      return { why: `\`${part}\` names a device` };
  }
  if (!ending.some((end) => name.toLowerCase().endsWith(end))) {
    return { why: `the file name must end in ${ending.join(' or ')}` };
  }
  const slash = Math.max(owner.lastIndexOf('/'), owner.lastIndexOf('\\'));
  return { path: owner.slice(0, slash + 1) + name };
}
