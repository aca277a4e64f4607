import type { ProblemList } from '../problems.js';
import { LONGEST_FILE, LONGEST_LINE } from './caps.js';

/** What a reader gives back: text, or the bytes of a file. */
export type FileContent = string | Uint8Array;

/** Text without its byte-order mark; bytes that are no UTF-8 become U+FFFD, which is refused. */
export function decode(content: FileContent): string {
  if (typeof content !== 'string') {
    const [first, second] = content;
    const wide = (first === 0xff && second === 0xfe) || (first === 0xfe && second === 0xff);
    // Read as bytes, UTF-16 keeps the zeros that tell it apart.
    return wide ? '\0' : new TextDecoder('utf-8').decode(content);
  }
  return content.startsWith('\ufeff') ? content.slice(1) : content;
}

/**
 * Refuses text that is too large, is no UTF-8, or shows a reader something else than it says.
 * @returns false after reporting why
 */
export function readable(
  text: string,
  file: number,
  problems: ProblemList,
  longest = LONGEST_FILE,
): boolean {
  if (text.length > longest) {
    const at = { file, start: 0, end: 0 };
    problems.report('tooLarge', at, `the file has more than ${longest / 1024} KiB`);
    return false;
  }
  return wellEncoded(text, file, problems) && shortLines(text, file, problems);
}

// Control characters, halves of surrogate pairs, the replacement character, and characters that
// turn the writing direction (N. Boucher and R. Anderson, "Trojan Source", 2021).
const STRANGE =
  // biome-ignore lint/suspicious/noControlCharactersInRegex: they are what is looked for
  /[\u0000-\u0008\u000b\u000c\u000e-\u001f\u007f\u0085\u2028\u2029\ufffd\ufeff\u202a-\u202e\u2066-\u2069]|\p{Cs}|\r(?!\n)/u;

function wellEncoded(text: string, file: number, problems: ProblemList): boolean {
  const found = STRANGE.exec(text);
  if (!found) return true;
  const code = found[0].codePointAt(0)!;
  const at = { file, start: found.index, end: found.index + 1 };
  const name = `U+${code.toString(16).toUpperCase().padStart(4, '0')}`;
  const expected = 'plain UTF-8 text; save the file again as UTF-8';
  if (code === 0)
    problems.report('encoding', at, 'this looks like UTF-16 or no text at all', { expected });
  else if (code === 0xfffd)
    problems.report('encoding', at, 'bytes that are no UTF-8', { expected });
  else if (code === 0x0d)
    problems.report('encoding', at, 'a line ends in CR alone', { expected: 'LF or CR LF' });
  else problems.report('encoding', at, `a character that cannot be seen, ${name}`, { expected });
  return false;
}

function shortLines(text: string, file: number, problems: ProblemList): boolean {
  for (let start = 0; start < text.length; ) {
    const newline = text.indexOf('\n', start);
    const end = newline < 0 ? text.length : newline;
    if (end - start > LONGEST_LINE) {
      problems.report(
        'tooLarge',
        { file, start, end: start + 1 },
        `a line of more than ${LONGEST_LINE} letters`,
      );
      return false;
    }
    start = end + 1;
  }
  return true;
}
