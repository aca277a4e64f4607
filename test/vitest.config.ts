import { defineConfig } from 'vitest/config';

/** Folders whose tests are arithmetic and files alone: they share a worker's modules, which is quicker. */
const PURE = [
  'rules',
  'engine',
  'wire',
  'track',
  'guard',
  'plasticity',
  'board',
  'animal',
  'errors',
];
const pure = [...PURE, 'analysis'].map((folder) => `test/${folder}/**/*.test.ts`);

export default defineConfig({
  test: {
    root: new URL('..', import.meta.url).pathname,
    testTimeout: 30_000,
    hookTimeout: 60_000,
    maxWorkers: 2,
    // Real processes, sockets and a browser meet machines that stand still for a second or more. What
    // fails twice in a row is no accident of the machine.
    retry: 1,
    projects: [
      { extends: true, test: { name: 'pure', include: pure, isolate: false } },
      { extends: true, test: { name: 'whole', include: ['test/**/*.test.ts'], exclude: pure } },
    ],
  },
});
