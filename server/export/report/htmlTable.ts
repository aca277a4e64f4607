import { escapeHtml } from './plot.js';

export type Cell = string | number;

/** A number, or one with a bound or an uncertainty: `12.5`, `< 0.001`, `3.2 ±0.1`. */
const NUMERIC = /^[-<]? ?[\d.]+( ±[\d.]+)?$/;

/** An HTML table; columns of numbers stand to the right, their heads with them. */
export function table(
  head: readonly string[],
  rows: readonly (readonly Cell[])[],
  name = '',
): string {
  const columns = Math.max(head.length, ...rows.map((row) => row.length));
  const numeric = Array.from({ length: columns }, (_, c) => {
    const cells = rows.map((row) => String(row[c] ?? '')).filter((text) => text !== '');
    return cells.every((text) => NUMERIC.test(text));
  });
  const line = (tag: string, cells: readonly Cell[]) => {
    const all = cells.map((value, c) => {
      const kind = numeric[c] ? ' class="n"' : '';
      return `<${tag}${kind}>${escapeHtml(String(value))}</${tag}>`;
    });
    return `<tr>${all.join('')}</tr>`;
  };
  const top = head.length === 0 ? '' : `<thead>${line('th', head)}</thead>`;
  const body = rows.map((row) => line('td', row)).join('\n');
  return `<table class="${name}">${top}<tbody>${body}</tbody></table>`;
}

/** Facts with their names, a line each; what is not known (an empty text) is left out. */
export function factsTable(rows: readonly (readonly [name: string, value: Cell])[]): string {
  const lines = rows
    .filter(([, value]) => value !== '')
    .map(([name, value]) => `<tr><th>${name}</th><td>${escapeHtml(String(value))}</td></tr>`);
  return `<table class="facts"><tbody>${lines.join('\n')}</tbody></table>`;
}

/** A number with so many decimals; nothing where it is not known. */
export const fixed = (value: number | null | undefined, digits: number) =>
  value === null || value === undefined || Number.isNaN(value) ? '' : value.toFixed(digits);

/** `1 lap`, `3 laps`. */
export const counted = (count: number, what: string) => `${count} ${what}${count === 1 ? '' : 's'}`;
