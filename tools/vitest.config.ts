import { defineConfig } from 'vitest/config';

export default defineConfig({
  root: new URL('..', import.meta.url).pathname,
  test: {
    include: ['tests/**/*.test.ts'],
    testTimeout: 120_000,
    hookTimeout: 120_000,
    pool: 'forks',
    // benches have fixed ports and live runs want the processor: one file after another
    fileParallelism: false,
    coverage: {
      provider: 'v8',
      include: ['runtime/**', 'plants/**', 'bridge/**', 'configs/**', 'tools/**'],
      reporter: ['text-summary'],
    },
  },
});
