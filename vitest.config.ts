import { defineConfig } from 'vitest/config'

/** Tests that start the built program; all others read sources only and need no build. */
const built = ['tests/shells/**/*.test.ts', 'tests/window/**/*.test.ts']
const limits = { testTimeout: 60_000, hookTimeout: 120_000 }

export default defineConfig({
  test: {
    projects: [
      {
        test: {
          ...limits,
          name: 'sources',
          include: ['src-main/**/*.test.ts', 'src-renderer/**/*.test.ts', 'tests/**/*.test.ts'],
          exclude: built
        }
      },
      { test: { ...limits, name: 'program', include: built, globalSetup: ['tests/shells/build-once.ts'] } }
    ]
  }
})
