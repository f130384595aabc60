/**
 * How the program is built: the main-side bundles, the preload script and the window, into out/.
 *
 * Main and preload are CommonJS in .cjs files, so that one and the same bundle starts under Node and in Electron.
 * Only what carries native code or loads files of its own at run time stays outside the bundles.
 */
import { resolve } from 'node:path'
import { svelte } from '@sveltejs/vite-plugin-svelte'
import { defineConfig } from 'electron-vite'

const root = import.meta.dirname
const commonJs = { format: 'cjs', entryFileNames: '[name].cjs', chunkFileNames: 'chunks/[name]-[hash].cjs' } as const

export default defineConfig({
  main: {
    build: {
      outDir: resolve(root, 'out/main'),
      externalizeDeps: false,
      minify: false,
      target: 'node18',
      rolldownOptions: {
        input: {
          electron: resolve(root, 'src-main/shells/electron.ts'),
          web: resolve(root, 'src-main/shells/web.ts'),
          cli: resolve(root, 'src-main/shells/cli.ts'),
          'fit-worker': resolve(root, 'src-main/workers/fit-worker.ts')
        },
        external: ['electron', 'better-sqlite3', 'piscina'],
        output: commonJs
      }
    }
  },
  preload: {
    build: {
      outDir: resolve(root, 'out/preload'),
      externalizeDeps: false,
      minify: false,
      target: 'node18',
      rolldownOptions: {
        input: { preload: resolve(root, 'src-main/shells/preload.ts') },
        external: ['electron'],
        output: { ...commonJs, codeSplitting: false }
      }
    }
  },
  renderer: {
    root: resolve(root, 'src-renderer'),
    base: './',
    plugins: [svelte({ configFile: false })],
    build: {
      outDir: resolve(root, 'out/renderer'),
      target: 'chrome114',
      // Fonts and pictures stay files: the page's content security policy allows no data: fonts.
      assetsInlineLimit: 0,
      rolldownOptions: { input: resolve(root, 'src-renderer/index.html') }
    }
  }
})
