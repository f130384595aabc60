/**
 * The layer rule, one direction only: a folder imports from folders below it, never from one above or beside it.
 * Every rule is an error. Tests beside a source may look at anything, and so are left out.
 */

/** Top to bottom. */
const layers = ['shells', 'operations', 'reporting', 'project', 'importing', 'workers', 'study', 'statistics']

/** The floors of statistics, top to bottom; rooms of one floor do not import each other. */
const floors = [
  ['comparison', 'invariance', 'planning', 'resampling'],
  ['fit'],
  ['estimation'],
  ['model', 'moments'],
  ['distributions', 'matrix']
]

const tests = '\\.test\\.ts$'

const layerRules = layers.slice(1).map((layer, place) => ({
  name: `${layer}-imports-only-below`,
  comment: `src-main/${layer} may import only from the layers below it.`,
  severity: 'error',
  from: { path: `^src-main/${layer}/`, pathNot: tests },
  to: { path: [`^src-main/(${layers.slice(0, place + 1).join('|')})/`, '^src-renderer/'] }
}))

const floorRules = floors.flatMap((rooms, floor) =>
  rooms.map((room) => {
    const forbidden = [...floors.slice(0, floor).flat(), ...rooms.filter((other) => other !== room)]
    return {
      name: `statistics-${room}-imports-only-below`,
      comment: `src-main/statistics/${room} may import only from the floors of statistics below it.`,
      severity: 'error',
      from: { path: `^src-main/statistics/${room}/`, pathNot: tests },
      to: { path: `^src-main/statistics/(${forbidden.join('|') || 'none'})/` }
    }
  })
)

module.exports = {
  forbidden: [
    ...layerRules,
    ...floorRules,
    {
      name: 'shells-import-no-window',
      comment: 'A shell loads the built window; it does not import its source.',
      severity: 'error',
      from: { path: '^src-main/shells/' },
      to: { path: '^src-renderer/' }
    },
    {
      name: 'statistics-imports-only-statistics',
      comment: 'Statistics are pure: no other layer, no Node, no package but ml-matrix and jstat.',
      severity: 'error',
      from: { path: '^src-main/statistics/', pathNot: tests },
      to: { pathNot: '^(src-main/statistics/|node_modules/(ml-matrix|jstat)/)' }
    },
    {
      name: 'window-knows-only-the-contract',
      comment: 'Of src-main the window may import the contract alone.',
      severity: 'error',
      from: { path: '^src-renderer/', pathNot: tests },
      to: { path: '^src-main/', pathNot: '^src-main/operations/contract\\.ts$' }
    },
    {
      name: 'window-imports-only-types-from-the-contract',
      comment: 'Types only cross the contract.',
      severity: 'error',
      from: { path: '^src-renderer/', pathNot: tests },
      to: { path: '^src-main/', dependencyTypesNot: ['type-only'] }
    },
    {
      name: 'window-uses-no-node',
      comment: 'The window runs sandboxed in a page.',
      severity: 'error',
      from: { path: '^src-renderer/', pathNot: tests },
      to: { dependencyTypes: ['core'] }
    },
    {
      name: 'contract-is-types-only',
      comment: 'The contract pulls nothing to run into the window.',
      severity: 'error',
      from: { path: '^src-main/operations/contract\\.ts$' },
      to: { dependencyTypesNot: ['type-only'] }
    },
    {
      name: 'only-shells-import-electron',
      comment: "Importing electron outside Electron fetches its runtime; only the shells' own entries may.",
      severity: 'error',
      from: { pathNot: '^src-main/shells/(electron|preload)\\.ts$' },
      to: { path: ['^electron$', '^node_modules/electron/'] }
    },
    {
      name: 'only-project-opens-a-database',
      comment: 'One folder knows the project file.',
      severity: 'error',
      from: { path: '^src-', pathNot: ['^src-main/project/', tests] },
      to: { path: '^node_modules/(@types/)?better-sqlite3/' }
    },
    {
      name: 'no-circles',
      comment: 'Two files that need each other are one concept or three.',
      severity: 'error',
      from: {},
      to: { circular: true }
    },
    {
      name: 'imports-are-found',
      comment: 'An import that cannot be resolved could hide a broken layer.',
      severity: 'error',
      from: {},
      to: { couldNotResolve: true }
    }
  ],
  options: {
    doNotFollow: { path: 'node_modules' },
    tsPreCompilationDeps: true,
    tsConfig: { fileName: 'tsconfig.json' },
    enhancedResolveOptions: {
      exportsFields: ['exports'],
      conditionNames: ['import', 'require', 'node', 'default', 'types', 'svelte']
    }
  }
}
