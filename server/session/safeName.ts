/**
 * A part of a folder's name made from words a person typed: letters, digits, `.`, `_` and `-` of
 * ASCII, at most `most` of them, never empty, never one that a system treats apart.
 *
 * Names Windows keeps for devices, with or without an extension, and its ban on a trailing dot:
 * https://learn.microsoft.com/windows/win32/fileio/naming-a-file
 */
export function safeName(words: string, most: number, otherwise: string): string {
  const plain = words
    // Accented letters lose their accents (Unicode normalisation form KD) rather than vanish.
    .normalize('NFKD')
    .replace(/\p{Mark}+/gu, '')
    .replace(/[^A-Za-z0-9._-]+/g, '-')
    // No run of dots can climb out of a folder, and no leading dot hides one.
    .replace(/\.{2,}/g, '.')
    .replace(/-{2,}/g, '-')
    .slice(0, most)
    .replace(/^[-._]+|[-._]+$/g, '');
  if (plain === '') return otherwise;
  return /^(con|prn|aux|nul|com\d|lpt\d)(\.|$)/i.test(plain) ? `${otherwise}-${plain}` : plain;
}
