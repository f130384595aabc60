// Prints what a test run's JSON report says, the counts on the last line. Fails when anything failed, was skipped, or nothing ran.
const { readFileSync } = require('node:fs')

const report = JSON.parse(readFileSync(process.argv[2], 'utf8'))
const counts = { passed: 0, failed: 0, skipped: 0 }
for (const file of report.testResults) {
  for (const test of file.assertionResults) {
    const kind = test.status === 'passed' || test.status === 'failed' ? test.status : 'skipped'
    counts[kind]++
    if (kind !== 'passed') console.log(`${kind}: ${file.name}: ${test.fullName}`)
  }
  // A file that could not even be loaded has no tests of its own to count.
  if (file.status === 'failed' && file.assertionResults.every((test) => test.status !== 'failed')) {
    counts.failed++
    console.log(`failed: ${file.name}: ${String(file.message).split('\n')[0]}`)
  }
}
if (counts.skipped > 0) console.log(`${counts.skipped} skipped, which this repository does not allow`)
console.log(`${counts.passed} passed, ${counts.failed} failed`)
process.exitCode = counts.failed > 0 || counts.skipped > 0 || counts.passed === 0 ? 1 : 0
