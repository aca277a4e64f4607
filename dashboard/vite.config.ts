import { defineConfig } from 'vite';

export default defineConfig({
  root: import.meta.dirname,
  base: '/',
  build: {
    outDir: '../dist/dashboard',
    emptyOutDir: true,
    target: 'es2022',
    // The page's policy allows no data: scripts and no inline ones: every asset is a file.
    assetsInlineLimit: 0,
    modulePreload: { polyfill: false },
    rollupOptions: {
      input: [`${import.meta.dirname}/index.html`, `${import.meta.dirname}/sign-in.html`],
    },
  },
  oxc: { jsx: { runtime: 'automatic', importSource: 'preact' } },
  server: { proxy: { '/api': { target: 'http://127.0.0.1:8711', ws: true } } },
});
