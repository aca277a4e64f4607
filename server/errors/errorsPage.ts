import { ERRORS, type ErrorEntry } from './codes.js';

const AREAS: Readonly<Record<string, string>> = {
  LINK: 'The board and its line',
  RIG: 'The rig file',
  RULES: 'The rules file',
  RECORD: 'The record',
  EXPORT: 'Exports',
  ALIGN: 'Alignment with another clock',
  REPORT: 'Reports',
  LOOP: 'The loop process and its clients',
  WEB: 'The page and its interface',
  CLI: 'The command line',
  SIM: 'The simulated rig',
};

/** `ERRORS.md`, made from the table, so that the page cannot say anything else. */
export function errorsPage(): string {
  const byArea = new Map<string, ErrorEntry[]>();
  for (const entry of Object.values(ERRORS)) {
    const area = entry.code.split('_')[0]!;
    byArea.set(area, [...(byArea.get(area) ?? []), entry]);
  }
  const parts = [
    '# Errors',
    '',
    'Every error that Lapwing tells a user has a code that does not change. This page is made from',
    '`server/errors/codes.ts` by `npm run pages`. What is wrong within a rules file has codes of its',
    'own, in [RULES.md](../rules/RULES.md).',
  ];
  for (const [area, entries] of byArea) {
    parts.push('', `## ${AREAS[area] ?? area}`);
    for (const { code, meaning, remedy } of entries) {
      parts.push('', `### ${code}`, '', meaning, '', `**What to do:** ${remedy}`);
    }
  }
  return `${parts.join('\n')}\n`;
}
