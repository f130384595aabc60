/** The window on the stand-in client: served by vite.config.ts beside this file while developing. */
import type { Client } from '../../../src-main/operations/contract.ts'
import { mockClient } from './mock-client.ts'

const page = globalThis as unknown as { rungwise: Client; location: { search: string } }
const asked = new URLSearchParams(page.location.search)
page.rungwise = mockClient({ empty: asked.has('empty'), slow: asked.has('slow') })
