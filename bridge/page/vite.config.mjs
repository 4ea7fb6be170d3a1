import { fileURLToPath } from 'node:url';
import { defineConfig } from 'vite';

/** Builds the live page into dist/bridge/page: `vite build --config bridge/page/vite.config.mjs`. */
export default defineConfig({
  root: fileURLToPath(new URL('.', import.meta.url)),
  base: '/',
  // the strict content security policy forbids code made from text: this build of msgpackr never tries
  resolve: { alias: { msgpackr: 'msgpackr/index-no-eval' } },
  oxc: { jsx: { runtime: 'automatic', importSource: 'preact' } },
  build: {
    outDir: fileURLToPath(new URL('../../dist/bridge/page', import.meta.url)),
    emptyOutDir: true,
    target: 'es2022',
    // small files would become data: addresses, which the policy does not allow for scripts
    assetsInlineLimit: 0,
    modulePreload: { polyfill: false },
    // the graph-layout library is one file of 1.6 MB, loaded only with the circuit
    chunkSizeWarningLimit: 2000,
  },
});
