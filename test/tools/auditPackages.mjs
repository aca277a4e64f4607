/** Whether a package that ships has a known hole: `npm audit`, where the registry answers it. */
import { spawnSync } from 'node:child_process';

const ARGS = [
  'audit',
  '--omit=dev',
  '--audit-level=high',
  '--json',
  '--fetch-retries=0',
  '--fetch-timeout=20000',
];

/**
 * Runs the audit of what ships, holes of level `high` and above.
 * @param {string} root the package's folder
 * @returns {{ good: boolean, words: string }} good too where nobody answers, which is said
 */
export function auditPackages(root, run = npm) {
  const { status, stdout } = run(root);
  let report;
  try {
    report = JSON.parse(stdout);
  } catch {
    report = {};
  }
  const found = report.metadata?.vulnerabilities;
  if (found === undefined) {
    const why = report.error?.summary || report.message || 'no answer';
    return {
      good: true,
      words: `the registry does not answer npm audit here (${String(why).trim()})`,
    };
  }
  const counts = Object.entries(found).filter(([level, count]) => level !== 'total' && count > 0);
  const words = counts.map(([level, count]) => `${count} ${level}`).join(', ') || 'nothing known';
  const names = Object.values(report.vulnerabilities ?? {})
    .filter(({ severity }) => severity === 'high' || severity === 'critical')
    .map(({ name }) => name);
  const which = names.length > 0 ? ` (${names.join(', ')})` : '';
  return { good: status === 0, words: `npm audit of what ships: ${words}${which}` };
}

function npm(cwd) {
  const shell = process.platform === 'win32';
  return spawnSync('npm', ARGS, { cwd, encoding: 'utf8', shell, timeout: 60_000 });
}
