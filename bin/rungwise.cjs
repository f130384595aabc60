#!/usr/bin/env node
'use strict'
// The launcher: finds a Node that is new enough and hands over to the built command line (out/main/cli.cjs).
// It runs before that is known, so it keeps to syntax and calls that any Node of the last ten years has.

const childProcess = require('node:child_process')
const fs = require('node:fs')
const path = require('node:path')

const root = path.join(__dirname, '..')
const cli = path.join(root, 'out', 'main', 'cli.cjs')
/** better-sqlite3 is built on Node-API 10 and would end an older process without a word. */
const neededApi = 10

if (Number(process.versions.napi) >= neededApi) start()
else startUnderNewerNode()

function start() {
  if (!fs.existsSync(cli)) fail('rungwise is not built yet. Run: npm run build')
  require(cli).run(process.argv.slice(2), root)
}

function startUnderNewerNode() {
  const node = bundledNode()
  if (node === null) {
    fail(
      'rungwise needs Node 22.14 or newer and this is ' +
        process.version +
        '. Run: npm ci (which brings one along), or install a newer Node'
    )
  }
  const child = childProcess.spawn(node, [__filename].concat(process.argv.slice(2)), { stdio: 'inherit' })
  // A terminal signals the whole group; what is sent to this process alone is passed on. The child decides when to end.
  const signals = ['SIGINT', 'SIGTERM', 'SIGHUP']
  signals.forEach((name) => {
    process.on(name, () => {
      if (name !== 'SIGINT' || !process.stdin.isTTY) child.kill(name)
    })
  })
  child.on('error', (error) => {
    fail('rungwise could not start ' + node + ': ' + error.message)
  })
  child.on('exit', (code, signal) => {
    if (signal !== null) {
      signals.forEach((name) => {
        process.removeAllListeners(name)
      })
      process.kill(process.pid, signal)
    } else {
      process.exitCode = code
    }
  })
}

/** The newer Node that an optional dependency brings for this platform, or null. */
function bundledNode() {
  const system = process.platform === 'win32' ? 'win' : process.platform
  const name = 'node-' + system + '-' + process.arch
  const file = path.join('bin', process.platform === 'win32' ? 'node.exe' : 'node')
  let folder = __dirname
  for (;;) {
    const candidate = path.join(folder, 'node_modules', name, file)
    if (fs.existsSync(candidate)) return candidate
    const parent = path.dirname(folder)
    if (parent === folder) return null
    folder = parent
  }
}

function fail(message) {
  process.stderr.write(message + '\n')
  process.exit(1)
}
