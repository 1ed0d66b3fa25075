import { defineConfig } from 'vitest/config'

// The tests that hold the rooms under mutation (`npm run mutate`): without workers, long experiments and what is solved while a file loads.
export default defineConfig({
  test: {
    include: [
      'test/{stationary,estimation,comparison,planning,numbers}/**/*.test.ts',
      'test/published/{scenarios,critical-values,nist,output-analysis}.test.ts',
    ],
    exclude: ['test/stationary/large.test.ts'],
    testTimeout: 60_000,
  },
})
