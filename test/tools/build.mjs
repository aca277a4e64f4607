/**
 * `npm run build`: fills `dist/`, so that `node dist/server/main/main.js` is the whole program.
 *
 * Only code goes there. What the code reads at run time and is not code (schemas, the demo's YAML,
 * firmware) stays where it is in the source tree and is found by `packageRoot`
 * (server/packageRoot.ts), which is right from source (vitest) and from `dist/` alike.
 *
 * Nothing that has not changed is done again.
 */
import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import { createRequire } from 'node:module';
import path from 'node:path';
import { fileURLToPath } from 'node:url';

const root = fileURLToPath(new URL('../..', import.meta.url));
const dist = path.join(root, 'dist');

/** Every file below `folder`, as paths from the root with forward slashes. */
function filesBelow(folder) {
  const full = path.join(root, folder);
  if (!fs.existsSync(full)) return [];
  return fs
    .readdirSync(full, { recursive: true, withFileTypes: true })
    .filter((item) => item.isFile())
    .map((item) => path.relative(root, path.join(item.parentPath, item.name)))
    .map((file) => file.split(path.sep).join('/'))
    .filter((file) => !file.includes('/node_modules/'))
    .sort();
}

function run(what, command, args) {
  const { status, error } = spawnSync(command, args, { cwd: root, stdio: 'inherit' });
  if (status === 0) return;
  console.error(`build: ${what} failed${error ? `: ${error.message}` : ''}`);
  process.exit(1);
}

/** Runs a package's own program with this Node, whatever the shell. */
function runTool(what, name, bin, args) {
  const at = createRequire(import.meta.url).resolve(`${name}/package.json`);
  run(what, process.execPath, [path.join(path.dirname(at), bin), ...args]);
}

const tsc = (what, project) => runTool(what, 'typescript', 'bin/tsc', ['-p', project]);

/** Takes out of `dist/` what has no source any more, so that no ghost of a renamed file runs. */
function removeStale() {
  for (const folder of ['server', 'hardware-sim', 'test']) {
    for (const file of filesBelow(`dist/${folder}`)) {
      const source = file.slice('dist/'.length);
      const stem = source.replace(/\.js(\.map)?$/, '');
      const made = stem !== source && ['.ts', '.tsx', '.mts'].some((end) => exists(stem + end));
      if (!made) fs.rmSync(path.join(root, file), { force: true });
    }
  }
}
const exists = (file) => fs.existsSync(path.join(root, file));

/** What the dashboard's bundle is made from, to see whether it must be made again. */
function dashboardInputs() {
  const files = [
    ...filesBelow('dashboard'),
    ...filesBelow('server').filter((f) => /\.ts$/.test(f)),
  ];
  return [...files, 'package-lock.json', 'test/tools/build.mjs']
    .map((file) => [file, fs.statSync(path.join(root, file))])
    .map(([file, stat]) => `${file} ${stat.size} ${stat.mtimeMs}`)
    .join('\n');
}

function buildDashboard() {
  const config = 'dashboard/vite.config.ts';
  const stamp = path.join(dist, '.dashboard-inputs');
  const inputs = dashboardInputs();
  const made = exists('dist/dashboard/index.html') && fs.existsSync(stamp);
  if (made && fs.readFileSync(stamp, 'utf8') === inputs) return;
  fs.rmSync(stamp, { force: true });
  tsc('checking the types of the dashboard', 'test/tools/tsconfig.dashboard.json');
  runTool('bundling the dashboard', 'vite', 'bin/vite.js', [
    'build',
    'dashboard',
    '--config',
    config,
    '--outDir',
    path.join(dist, 'dashboard'),
    '--emptyOutDir',
    '--logLevel',
    'warn',
  ]);
  fs.writeFileSync(stamp, inputs);
}

fs.mkdirSync(dist, { recursive: true });
removeStale();
tsc('compiling', 'test/tools/tsconfig.build.json');
buildDashboard();
