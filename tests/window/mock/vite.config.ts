/** `npx vite --config tests/window/mock/vite.config.ts` shows the window on its stand-in client. */
import { fileURLToPath } from 'node:url'
import { svelte } from '@sveltejs/vite-plugin-svelte'
import { defineConfig } from 'vite'

const root = fileURLToPath(new URL('.', import.meta.url))
export default defineConfig({
  root,
  base: './',
  plugins: [svelte({ configFile: false })],
  server: { fs: { allow: [fileURLToPath(new URL('../../..', import.meta.url))] } },
  build: { target: 'chrome114', outDir: `${root}/out`, emptyOutDir: true }
})
