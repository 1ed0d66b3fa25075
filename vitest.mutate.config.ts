import { defineConfig } from 'vitest/config'

// The tests that hold the rooms under mutation (`npm run mutate`): without workers and long experiments.
export default defineConfig({
  test: {
    include: [
      'test/{stationary,estimation,comparison,planning,numbers}/**/*.test.ts',
      'test/published/{finite,scenarios,critical-values,nist,output-analysis}.test.ts',
    ],
    exclude: ['test/stationary/large.test.ts'],
    testTimeout: 60_000,
  },
})
