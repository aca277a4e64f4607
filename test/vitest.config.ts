import { defineConfig } from 'vitest/config';

export default defineConfig({
  test: {
    root: new URL('..', import.meta.url).pathname,
    include: ['test/**/*.test.ts', 'test/**/*.test.tsx'],
    testTimeout: 30_000,
    hookTimeout: 60_000,
    maxWorkers: 2,
    // Real processes, sockets and a browser meet machines that stand still for a second or more. What
    // fails twice in a row is no accident of the machine.
    retry: 1,
  },
});
