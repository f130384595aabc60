/**
 * The built window's own files, as both window shells serve them: nothing outside its folder, each with its type and the
 * content security policy.
 */
import { readFile } from 'node:fs/promises'
import { extname, join, normalize, sep } from 'node:path'

/** Everything comes from the program itself; inline styles are allowed because drawings set them, inline scripts never. */
export const contentSecurityPolicy = [
  "default-src 'none'",
  "script-src 'self'",
  "style-src 'self' 'unsafe-inline'",
  "font-src 'self'",
  "img-src 'self' data:",
  "connect-src 'self'",
  "base-uri 'none'",
  "form-action 'none'",
  "frame-ancestors 'none'"
].join('; ')

const types: Readonly<Record<string, string>> = {
  '.html': 'text/html; charset=utf-8',
  '.js': 'text/javascript; charset=utf-8',
  '.css': 'text/css; charset=utf-8',
  '.json': 'application/json; charset=utf-8',
  '.svg': 'image/svg+xml',
  '.png': 'image/png',
  '.woff2': 'font/woff2'
}

/** Answers a request for `urlPath` (as in a URL, "/" is the page) out of `folder`: 200 with the file, or 404. */
export async function windowFile(folder: string, urlPath: string): Promise<Response> {
  const file = fileIn(folder, urlPath)
  const body = file === null ? null : await readFile(file).catch(() => null)
  if (file === null || body === null) return new Response('Not found', { status: 404, headers: securityHeaders })
  const type = types[extname(file)] ?? 'application/octet-stream'
  return new Response(body, { headers: { ...securityHeaders, 'content-type': type, 'cache-control': 'no-store' } })
}

export const securityHeaders: Readonly<Record<string, string>> = {
  'content-security-policy': contentSecurityPolicy,
  'x-content-type-options': 'nosniff',
  'referrer-policy': 'no-referrer',
  'cross-origin-opener-policy': 'same-origin',
  'cross-origin-resource-policy': 'same-origin'
}

function fileIn(folder: string, urlPath: string): string | null {
  const decoded = decode(urlPath)
  if (decoded === null || decoded.includes('\0')) return null
  const file = normalize(join(folder, decoded === '/' ? 'index.html' : decoded))
  return file.startsWith(folder + sep) ? file : null
}

function decode(urlPath: string): string | null {
  try {
    return decodeURIComponent(urlPath)
  } catch {
    return null
  }
}
