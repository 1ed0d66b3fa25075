// Holds the arrows between the rooms: the table in DEVELOPERS.md, line by line. A room that is not named for a
// folder may not be imported from it, neither for values nor for types.
const everyone = ['errors', 'numbers']
const mayImport = {
  errors: [],
  numbers: [],
  scenario: [],
  model: ['scenario'],
  chain: ['model'],
  recurrence: ['model', 'chain'],
  stationary: ['model', 'chain', 'recurrence'],
  dynamics: ['chain', 'stationary'],
  simulation: ['model', 'chain'],
  estimation: [],
  planning: ['dynamics', 'stationary', 'estimation'],
  trace: ['model'],
  comparison: ['chain', 'recurrence', 'stationary', 'dynamics', 'estimation'],
  jobs: [
    'scenario', 'model', 'chain', 'recurrence', 'stationary', 'dynamics', 'simulation', 'estimation', 'planning',
    'trace', 'comparison',
  ],
}
const arrows = Object.entries(mayImport).map(([room, rooms]) => ({
  name: `arrows-of-${room}`,
  severity: 'error',
  comment: `${room} may import ${[...rooms, ...(everyone.includes(room) ? [] : everyone)].join(', ') || 'nothing of ours'}`,
  from: { path: `^src/${room}/` },
  to: { path: '^src/', pathNot: `^src/(${[room, ...rooms, ...(everyone.includes(room) ? [] : everyone)].join('|')})/` },
}))

module.exports = {
  forbidden: [
    ...arrows,
    { name: 'no-cycles', severity: 'error', from: {}, to: { circular: true, dependencyTypesNot: ['type-only'] } },
    {
      name: 'report-takes-types-only',
      severity: 'error',
      from: { path: '^src/report/' },
      to: { path: '^src/(?!report/|errors/|numbers/)', dependencyTypesNot: ['type-only'] },
    },
    { name: 'nothing-imports-cli', severity: 'error', from: { pathNot: '^src/cli/' }, to: { path: '^src/cli/' } },
    { name: 'source-is-free-of-tests', severity: 'error', from: { path: '^src/' }, to: { path: '^test/' } },
    {
      name: 'packages-are-declared',
      severity: 'error',
      from: { path: '^src/' },
      to: { dependencyTypes: ['npm-dev', 'npm-no-pkg', 'npm-unknown'] },
    },
  ],
  options: {
    tsPreCompilationDeps: true,
    tsConfig: { fileName: 'tsconfig.json' },
    doNotFollow: { path: 'node_modules' },
    enhancedResolveOptions: { conditionNames: ['import', 'node', 'default', 'types'], exportsFields: ['exports'] },
  },
}
