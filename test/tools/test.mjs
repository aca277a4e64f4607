/**
 * `npm test`: installs what is missing where it may, then lint, types, build and every test.
 *
 * The last line is `N passed, N failed`. The tests are counted; a step before them that fails
 * (lint, types, build) counts as one more failure. Arguments go on to vitest:
 * `npm test -- test/link`.
 */
import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { auditPackages } from './auditPackages.mjs';

const root = fileURLToPath(new URL('../..', import.meta.url));
const BROWSERS = ['chromium', 'chromium-browser', 'google-chrome-stable', 'google-chrome'];
const COMPILER = ['gcc-avr', 'avr-libc', 'binutils-avr'];
const windows = process.platform === 'win32';

function run(command, args, env = {}) {
  const options = { cwd: root, stdio: 'inherit', env: { ...process.env, ...env } };
  return spawnSync(command, args, options).status === 0;
}

function onPath(name) {
  const folders = (process.env.PATH ?? '').split(path.delimiter);
  return folders.map((folder) => path.join(folder, name)).find((file) => fs.existsSync(file));
}

const findBrowser = () =>
  process.env.LAPWING_CHROMIUM ?? BROWSERS.map(onPath).find((file) => file !== undefined);

/** The browser that the dashboard's tests drive; Debian's package is installed when root. */
function ensureBrowser() {
  const found = findBrowser();
  if (found !== undefined) return found;
  if (process.getuid?.() === 0 && onPath('apt-get') !== undefined) {
    console.log('test: no chromium here; installing the Debian package');
    const env = { DEBIAN_FRONTEND: 'noninteractive' };
    run('apt-get', ['update', '-q'], env);
    run('apt-get', ['install', '-q', '-y', '--no-install-recommends', 'chromium'], env);
    const installed = findBrowser();
    if (installed !== undefined) return installed;
  }
  console.log(
    'test: no chromium found, so the browser tests will fail. Install it with ' +
      '`sudo apt-get install chromium` (Debian, Ubuntu), or set LAPWING_CHROMIUM to the program.',
  );
  return '';
}

/** The compiler with which the firmware's test builds it again; Debian's packages when root. */
function ensureCompiler() {
  if (onPath('avr-gcc') !== undefined && onPath('avr-objcopy') !== undefined) return;
  if (process.getuid?.() === 0 && onPath('apt-get') !== undefined) {
    console.log('test: no avr-gcc here; installing the Debian packages');
    const env = { DEBIAN_FRONTEND: 'noninteractive' };
    run('apt-get', ['update', '-q'], env);
    run('apt-get', ['install', '-q', '-y', '--no-install-recommends', ...COMPILER], env);
    if (onPath('avr-gcc') !== undefined) return;
  }
  console.log(
    'test: no avr-gcc found, so the test that builds the firmware again will fail. Install it ' +
      `with \`sudo apt-get install ${COMPILER.join(' ')}\` (Debian, Ubuntu).`,
  );
}

/** What the examples for a shell are written with. */
function ensureCurl() {
  ensureDebian(
    ['curl', 'ca-certificates'],
    () => onPath('curl') !== undefined,
    'no curl found, so the test of the HTTP examples for a shell will fail',
  );
}

/** The hobby platform's own sources, against which the firmware's sketch is built; Debian's when root. */
function ensureBoardSources() {
  if (fs.existsSync('/usr/share/arduino/hardware/arduino/avr')) return;
  if (process.getuid?.() === 0 && onPath('apt-get') !== undefined) {
    console.log('test: no board sources here; installing the Debian package');
    const env = { DEBIAN_FRONTEND: 'noninteractive' };
    run('apt-get', ['install', '-q', '-y', '--no-install-recommends', 'arduino-core-avr'], env);
  }
}

/** What reads an NWB file back and checks it: Debian's packages are installed when root. */
function ensureNwbReaders() {
  const python = fs.existsSync('/usr/bin/python3') ? '/usr/bin/python3' : 'python3';
  ensureDebian(
    ['python3-hdmf', 'python3-h5py'],
    () => spawnSync(python, ['-c', 'import hdmf, h5py'], { stdio: 'ignore' }).status === 0,
    'NWB files are written and not read back',
  );
}

/** The languages that the loaders beside the tables are for; Octave reads as MATLAB does. */
function ensureLanguages() {
  const missing = (what) => `the loader for ${what} is not run`;
  ensureDebian(['r-base-core'], () => onPath('Rscript') !== undefined, missing('R'));
  ensureDebian(['octave'], () => onPath('octave-cli') !== undefined, missing('Octave'));
}

/** Installs what only some tests need; where it is not to be had they say so and pass. */
function ensureDebian(packages, present, otherwise) {
  if (present()) return;
  const names = packages.join(' ');
  if (process.getuid?.() === 0 && onPath('apt-get') !== undefined) {
    console.log(`test: installing the Debian packages ${names}`);
    const env = { DEBIAN_FRONTEND: 'noninteractive' };
    run('apt-get', ['update', '-q'], env);
    run('apt-get', ['install', '-q', '-y', '--no-install-recommends', ...packages], env);
    if (present()) return;
  }
  console.log(
    `test: ${names} not to be had, so ${otherwise}. Install with ` +
      `\`sudo apt-get install ${names}\` (Debian, Ubuntu).`,
  );
}

function ensurePackages() {
  if (fs.existsSync(path.join(root, 'node_modules', 'vitest', 'package.json'))) return true;
  console.log('test: node_modules is missing; running `npm ci`');
  return spawnSync('npm', ['ci'], { cwd: root, stdio: 'inherit', shell: windows }).status === 0;
}

/** Runs a package's own program with this Node, whatever the shell. */
function tool(file, args, env) {
  return run(process.execPath, [path.join(root, 'node_modules', file), ...args], env);
}

/** Exact counts out of vitest's JSON report; a file that would not load is one failure. */
function countTests(file) {
  if (!fs.existsSync(file)) return { passed: 0, failed: 0, skipped: 0 };
  const report = JSON.parse(fs.readFileSync(file, 'utf8'));
  const broken = report.testResults.filter(
    (result) => result.status === 'failed' && !result.assertionResults.some(isFailed),
  );
  return {
    passed: report.numPassedTests,
    failed: report.numFailedTests + broken.length,
    skipped: report.numPendingTests + report.numTodoTests,
  };
}
const isFailed = (assertion) => assertion.status === 'failed';

function runTests(filters, browser) {
  const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'lapwing-test-'));
  const file = path.join(folder, 'report.json');
  const args = ['run', '--config', 'test/vitest.config.ts', ...filters];
  const reporters = ['--reporter=default', '--reporter=json', `--outputFile.json=${file}`];
  const good = tool('vitest/vitest.mjs', [...args, ...reporters], { LAPWING_CHROMIUM: browser });
  const counts = countTests(file);
  fs.rmSync(folder, { recursive: true, force: true });
  return { good, ...counts };
}

let failedSteps = 0;
function step(name, good) {
  if (good) return;
  failedSteps++;
  console.error(`test: ${name} failed`);
}

function auditStep() {
  const { good, words } = auditPackages(root);
  console.log(`test: ${words}`);
  step('the audit of the packages that ship', good);
}

function main() {
  if (!ensurePackages()) {
    console.error('test: `npm ci` failed');
    return { passed: 0, failed: 1 };
  }
  const browser = ensureBrowser();
  ensureNwbReaders();
  ensureLanguages();
  ensureCurl();
  ensureCompiler();
  ensureBoardSources();
  step('lint (biome check)', tool('@biomejs/biome/bin/biome', ['check', '.']));
  step('the type check (tsc)', tool('typescript/bin/tsc', ['--noEmit']));
  const filters = process.argv.slice(2);
  if (filters.length === 0) auditStep();
  step('the build', run(process.execPath, ['test/tools/build.mjs']));
  const tests = runTests(filters, browser);
  if (tests.skipped > 0) console.log(`test: ${tests.skipped} skipped`);
  // vitest also fails on an error outside any test, and when there is no test at all.
  const counted = tests.failed > 0;
  step('the test run', counted || (tests.good && tests.passed > 0));
  return { passed: tests.passed, failed: tests.failed + failedSteps };
}

const { passed, failed } = main();
console.log(`${passed} passed, ${failed} failed`);
process.exitCode = failed === 0 ? 0 : 1;
