/**
 * A Candidate, as the user states it, becomes the model's cells.
 *
 * Derivation is resolved first (parent's content, then one's own changes in order). Then, group by group: the pattern,
 * the scaling, what is held equal across groups with every identification shift that follows (factor variances and
 * means freed where equal loadings or intercepts make them estimable; a reference indicator moved off a released
 * loading), and last the changes.
 */
import { cellWords } from '../statistics/model/cell-words.ts'
import type { Cell, GroupCells, ModelCells } from '../statistics/model/cells.ts'
import { CellClasses, Contradiction, type Equation, type Node } from './cell-classes.ts'
import { type Constraint, constraintWords } from './change-words.ts'
import { InputError } from './input-error.ts'
import { didYouMean } from './nearest.ts'
import {
  type Candidate,
  type CellName,
  type CellPart,
  type Change,
  type EqualSet,
  type Factor,
  kindsOfPart,
  namesOfPart,
  type Release,
  type Scaling,
  setOfPart
} from './study.ts'

/** A candidate with nothing left to its parents. */
export interface ResolvedCandidate {
  name: string
  factors: Factor[]
  scaling: Scaling
  factorCovariances: 'free' | 'zero'
  across: string | null
  equal: EqualSet[]
  except: Release[]
  changes: Change[]
}

/** What of the data a model needs to know. */
export interface ModelFrame {
  indicators: readonly string[]
  grouping: string | null
  groups: readonly (string | null)[]
  /** Whether means are known, so that a mean structure is modelled. */
  means: boolean
}

/** Follows `from` to the root. Throws InputError on an unknown name, a circle, or a root without factors. */
export function resolveCandidate(name: string, family: readonly Candidate[]): ResolvedCandidate {
  const byName = new Map(family.map((c) => [c.name, c]))
  const chain: Candidate[] = []
  for (let next: string | null = name; next !== null; ) {
    const candidate = byName.get(next)
    if (candidate === undefined) {
      const where = chain.length === 0 ? null : `candidate "${chain[0]!.name}"`
      throw new InputError(`there is no candidate "${next}"`, { where, remedy: didYouMean(next, [...byName.keys()], 'candidates') })
    }
    if (chain.includes(candidate)) throw new InputError('it is derived from itself', { where: `candidate "${name}"` })
    chain.unshift(candidate)
    next = candidate.from
  }
  return chain.reduce((parent: ResolvedCandidate | null, own) => derive(parent, own), null)!
}

function derive(parent: ResolvedCandidate | null, own: Candidate): ResolvedCandidate {
  const factors = own.factors ?? parent?.factors
  if (factors === undefined) {
    throw new InputError('it has no factors', {
      where: `candidate "${own.name}"`,
      remedy: 'Give factors, or from: another candidate.'
    })
  }
  return {
    name: own.name,
    factors,
    scaling: own.scaling ?? parent?.scaling ?? 'first loading',
    factorCovariances: own.factorCovariances ?? parent?.factorCovariances ?? 'free',
    across: own.across ?? parent?.across ?? null,
    equal: own.equalAcrossGroups ?? parent?.equal ?? [],
    except: [...(parent?.except ?? []), ...own.except],
    changes: [...(parent?.changes ?? []), ...own.change]
  }
}

/** The cells of a candidate on data of this frame. Throws InputError naming the candidate and the cell. */
export function candidateCells(candidate: ResolvedCandidate, frame: ModelFrame): ModelCells {
  return new CellBuilder(candidate, frame).build()
}

class CellBuilder {
  private readonly candidate: ResolvedCandidate
  private readonly frame: ModelFrame
  private readonly indicators: string[]
  private readonly factorNames: string[]
  private readonly groups: (string | null)[]
  private readonly cells = new CellClasses()
  /** Of effects coding, then of the changes, in order. */
  private equations: Equation[] = []
  /** Factors that another factor measures or predicts. */
  private readonly endogenous = new Set<string>()

  constructor(candidate: ResolvedCandidate, frame: ModelFrame) {
    this.candidate = candidate
    this.frame = frame
    this.factorNames = candidate.factors.map((f) => f.name)
    this.groups = this.groupNames()
    this.indicators = this.usedIndicators()
  }

  build(): ModelCells {
    this.groups.forEach((_, g) => {
      this.placePattern(g)
    })
    this.scale()
    this.tieAcrossGroups()
    for (const change of this.candidate.changes) this.apply(change)
    const { labels, constraints, bounds } = this.settle()
    return {
      indicators: this.indicators,
      factors: this.factorNames,
      groups: this.groups.map((name, g) => this.groupCells(name, g, labels)),
      constraints,
      ...(bounds.length > 0 ? { bounds } : {})
    }
  }

  private settle() {
    try {
      return this.cells.settle(this.equations, (node) => this.words(node))
    } catch (error) {
      if (error instanceof Contradiction) this.fail(error.message, error.remedy)
      throw error
    }
  }

  private words({ part, of, group }: Node): string {
    return cellWords(part, of, this.groups[group])
  }

  private fail(what: string, remedy: string | null = null): never {
    throw new InputError(what, { where: `candidate "${this.candidate.name}"`, remedy })
  }

  private groupNames(): (string | null)[] {
    const { across } = this.candidate
    if (across === null) return [null]
    if (this.frame.grouping === null) this.fail(`it is modelled across "${across}", but the data have no groups`)
    if (across !== this.frame.grouping)
      this.fail(`it is modelled across "${across}", but the data are grouped by "${this.frame.grouping}"`)
    return [...this.frame.groups]
  }

  private usedIndicators(): string[] {
    const used = new Set<string>()
    for (const factor of this.candidate.factors) {
      for (const name of factor.measures) {
        if (this.factorNames.includes(name)) {
          if (name === factor.name) this.fail(`factor "${name}" measures itself`)
          this.endogenous.add(name)
        } else if (this.frame.indicators.includes(name)) used.add(name)
        else {
          const remedy = didYouMean(name, [...this.frame.indicators, ...this.factorNames], 'indicators and factors')
          this.fail(`factor "${factor.name}" measures "${name}", which is neither an indicator nor a factor`, remedy)
        }
      }
    }
    return this.frame.indicators.filter((name) => used.has(name))
  }

  private node(part: CellPart, of: readonly string[], group: number): Node | undefined {
    return this.cells.find(part, of, group)
  }

  private put(part: CellPart, of: string[], group: number, fixed: number | null): Node {
    return this.cells.put(part, of, group, fixed)
  }

  private loadingPart(measure: string): CellPart {
    return this.factorNames.includes(measure) ? 'factor regression' : 'loading'
  }

  private placePattern(g: number): void {
    for (const factor of this.candidate.factors) {
      for (const measure of factor.measures) this.put(this.loadingPart(measure), [measure, factor.name], g, null)
      this.put('factor variance', [factor.name], g, null)
    }
    const exogenous = this.factorNames.filter((name) => !this.endogenous.has(name))
    exogenous.forEach((a, i) => {
      for (const b of exogenous.slice(0, i))
        this.put('factor covariance', [b, a], g, this.candidate.factorCovariances === 'free' ? null : 0)
    })
    for (const indicator of this.indicators) {
      this.put('residual variance', [indicator], g, null)
      if (this.frame.means) this.put('intercept', [indicator], g, null)
    }
    if (this.frame.means) for (const name of this.factorNames) this.put('factor mean', [name], g, 0)
  }

  /** Whether a cell of this part is held equal to the first group's, in group g. */
  private held(part: CellPart, of: readonly string[], g: number): boolean {
    if (!this.candidate.equal.includes(setOfPart[part])) return false
    return !this.candidate.except.some((r) => this.sameCell(r.cell, part, of) && (r.group === null || r.group === this.groups[g]))
  }

  private sameCell(cell: CellName, part: CellPart, of: readonly string[]): boolean {
    return cell.part === part && this.cells.key(part, cell.of, 0) === this.cells.key(part, of, 0)
  }

  /** Fixes what sets each factor's scale, or makes the equations of effects coding. */
  private scale(): void {
    const { scaling, factors } = this.candidate
    const meansCoded = new Set<string>()
    for (const factor of factors) {
      this.groups.forEach((_, g) => {
        if (scaling === 'first loading') this.fixReference(factor, g)
        if (scaling === 'factor variance' && !(g > 0 && this.anyHeld(factor, g)))
          this.node('factor variance', [factor.name], g)!.fixed = 1
        // Where loadings are held, the first group's equation sets the scale there too; one more would tie released ones.
        if (scaling === 'effects coding' && !(g > 0 && this.anyHeld(factor, g)))
          this.sumOf(this.loadingNodes(factor, g), factor.measures.length)
      })
      this.scaleMeans(factor, meansCoded)
    }
  }

  /** The first loading that no group has released carries the scale in every group. */
  private fixReference(factor: Factor, g: number): void {
    const everywhereHeld = (measure: string) => {
      const part = this.loadingPart(measure)
      return !this.candidate.except.some((r) => this.sameCell(r.cell, part, [measure, factor.name]))
    }
    const reference = factor.measures.find(everywhereHeld) ?? factor.measures[0]!
    this.node(this.loadingPart(reference), [reference, factor.name], g)!.fixed = 1
  }

  private anyHeld(factor: Factor, g: number): boolean {
    return factor.measures.some((measure) => this.held(this.loadingPart(measure), [measure, factor.name], g))
  }

  private loadingNodes(factor: Factor, g: number): Node[] {
    return factor.measures.map((measure) => this.node(this.loadingPart(measure), [measure, factor.name], g)!)
  }

  /**
   * Factor means: zero in the first group and free elsewhere once intercepts are held there; under effects coding free
   * everywhere with intercepts that sum to zero (of a factor that shares no indicator with one already coded so).
   */
  private scaleMeans(factor: Factor, coded: Set<string>): void {
    const own = factor.measures.filter((measure) => this.indicators.includes(measure))
    if (!this.frame.means || own.length === 0) return
    const effects = this.candidate.scaling === 'effects coding' && own.every((indicator) => !coded.has(indicator))
    if (effects) for (const indicator of own) coded.add(indicator)
    this.groups.forEach((_, g) => {
      const estimable = g > 0 && own.some((indicator) => this.held('intercept', [indicator], g))
      const likeFirst = this.held('factor mean', [factor.name], 0) && this.held('factor mean', [factor.name], g)
      if (effects || (estimable && !likeFirst)) this.node('factor mean', [factor.name], g)!.fixed = null
      if (effects && !estimable) {
        this.sumOf(
          own.map((indicator) => this.node('intercept', [indicator], g)!),
          0
        )
      }
    })
  }

  private sumOf(nodes: Node[], total: number): void {
    this.equations.push({ terms: nodes.map((node) => ({ node, times: 1 })), total, words: null })
  }

  private tieAcrossGroups(): void {
    if (this.candidate.equal.length > 0 && this.groups.length < 2) {
      this.fail('parts are held equal across groups, but it is not modelled across any', 'Add across: and the grouping column.')
    }
    for (const release of this.candidate.except) this.checkRelease(release)
    for (const node of this.cells.all()) if (node.group > 0) this.tieToFirstGroup(node)
  }

  private checkRelease({ cell, group }: Release): void {
    this.checkCell(cell)
    if (group !== null && !this.groups.includes(group))
      this.fail(`there is no group "${group}"`, didYouMean(group, this.groupList(), 'groups'))
    if (!this.candidate.equal.includes(setOfPart[cell.part])) {
      this.fail(`${cellWords(cell.part, cell.of)} cannot be released: ${setOfPart[cell.part]} are not held equal across groups`)
    }
  }

  private groupList(): string[] {
    return this.groups.filter((g) => g !== null)
  }

  private tieToFirstGroup(node: Node): void {
    if (!this.held(node.part, node.of, node.group)) return
    const anchor = this.groups.findIndex((_, g) => g < node.group && this.held(node.part, node.of, g))
    const first = anchor < 0 ? undefined : this.node(node.part, node.of, anchor)
    if (first !== undefined) this.tie(first, node)
  }

  /** Makes two cells equal; a fixed one fixes both. */
  private tie(a: Node, b: Node): void {
    if (this.cells.tie(a, b)) return
    const fixed = (node: Node) => `${cellWords(node.part, node.of)} is fixed at ${this.cells.top(node).fixed}`
    this.fail(`${fixed(a)} and ${fixed(b)}, so they cannot be equal`)
  }

  private checkCell(cell: CellName): void {
    const { part, of } = cell
    if (of.length !== namesOfPart[part]) this.fail(`a ${part} takes ${namesOfPart[part]} name(s), not ${of.length}`)
    kindsOfPart[part].forEach((kind, i) => {
      const known = kind === 'indicator' ? this.indicators : this.factorNames
      const name = of[i]!
      if (!known.includes(name))
        this.fail(`${cellWords(part, of)} names "${name}", which is no ${kind} of it`, didYouMean(name, known, `${kind}s`))
    })
    if (of.length === 2 && of[0] === of[1]) this.fail(`${cellWords(part, of)} names "${of[0]}" twice`)
    if ((part === 'intercept' || part === 'factor mean') && !this.frame.means) {
      this.fail(`${cellWords(part, of)} is named, but the data have no means`)
    }
  }

  private apply(change: Change): void {
    if (change.do === 'constrain') {
      this.constrain(change)
      return
    }
    const groups = this.groupsOf(change.group)
    if (change.do === 'equal') {
      for (const cell of change.cells) this.checkCell(cell)
      for (const g of groups) this.tieCells(change.cells, g)
      return
    }
    this.checkCell(change.cell)
    if (change.do === 'bound') {
      this.bound(change, groups)
      return
    }
    const { part, of } = change.cell
    for (const g of groups) {
      if (change.do === 'fix') this.fix(part, of, g, change.at)
      else this.free(part, of, g, change.group === null)
    }
  }

  /** One equation in each group it stands in, or one across groups where its terms name theirs. */
  private constrain(change: Constraint): void {
    for (const { cell } of change.terms) this.checkCell(cell)
    const across = change.terms.some((term) => term.group !== null)
    for (const g of across ? [0] : this.groupsOf(change.group)) {
      const terms = change.terms.map(({ cell, times, group }) => ({
        node: this.inModel(cell, group === null ? g : this.groupsOf(group)[0]!, 'constrained'),
        times
      }))
      const words = constraintWords(change)
      if (terms.every(({ node }) => this.cells.top(node).fixed !== null))
        this.fail(
          `${words}: every cell of this constraint is fixed, so it constrains nothing`,
          'Free one first, or remove the constraint.'
        )
      this.equations.push({ terms, total: change.to, words })
    }
  }

  /** In the groups where the cell is free; where it is fixed there is nothing to bound. */
  private bound({ cell, atLeast, atMost }: Extract<Change, { do: 'bound' }>, groups: readonly number[]): void {
    const nodes = groups.map((g) => this.inModel(cell, g, 'bounded'))
    const free = nodes.filter((node) => this.cells.top(node).fixed === null)
    if (free.length === 0)
      this.fail(
        `${cellWords(cell.part, cell.of)} is fixed at ${this.cells.top(nodes[0]!).fixed}, so it cannot be bounded`,
        'Free it first.'
      )
    for (const node of free) {
      node.atLeast = atLeast ?? node.atLeast
      node.atMost = atMost ?? node.atMost
    }
  }

  private inModel(cell: CellName, g: number, wish: string): Node {
    return (
      this.node(cell.part, cell.of, g) ??
      this.fail(`${cellWords(cell.part, cell.of)} is not in the model, so it cannot be ${wish}`, 'Free it first.')
    )
  }

  private groupsOf(group: string | null): number[] {
    if (group === null) return this.groups.map((_, g) => g)
    const at = this.groups.indexOf(group)
    if (at < 0) this.fail(`there is no group "${group}"`, didYouMean(group, this.groupList(), 'groups'))
    return [at]
  }

  private tieCells(cells: readonly CellName[], g: number): void {
    const nodes = cells.map((cell) => this.inModel(cell, g, 'made equal'))
    for (const node of nodes.slice(1)) this.tie(nodes[0]!, node)
  }

  private fix(part: CellPart, of: string[], g: number, at: number): void {
    const node = this.node(part, of, g) ?? this.put(part, of, g, at)
    this.cells.leave(node)
    node.fixed = at
  }

  /**
   * A cell that was fixed joins its part's equality across groups; one that was free becomes a parameter of its own, out of
   * the constraints that a change put on it. What sets its factor's scale stays.
   */
  private free(part: CellPart, of: string[], g: number, everywhere: boolean): void {
    const existing = this.node(part, of, g)
    const wasFree = existing !== undefined && this.cells.top(existing).fixed === null
    const node = existing ?? this.put(part, of, g, 0)
    this.cells.leave(node)
    node.fixed = null
    this.equations = this.equations.filter(({ terms, words }) => words === null || terms.every((term) => term.node !== node))
    if (part === 'factor regression') this.dropCovariance(of, g)
    if (!wasFree && everywhere && g > 0) this.tieToFirstGroup(node)
  }

  /** A regression takes the place of the two factors' covariance, which would otherwise say the same twice. */
  private dropCovariance(of: string[], g: number): void {
    const covariance = this.node('factor covariance', of, g)
    if (covariance === undefined) return
    this.cells.leave(covariance)
    covariance.fixed = 0
  }

  private groupCells(name: string | null, g: number, labels: Map<Node, string>): GroupCells {
    const cell = (part: CellPart, of: string[]): Cell => {
      const node = this.node(part, of, g)
      if (node === undefined) return 0
      const top = this.cells.top(node)
      return top.fixed ?? labels.get(top)!
    }
    const { indicators, factorNames } = this
    const sheet = (rows: string[], columns: string[], part: CellPart, diagonal: CellPart | null = null) =>
      rows.map((row) =>
        columns.map((column) => (diagonal !== null && row === column ? cell(diagonal, [row]) : cell(part, [row, column])))
      )
    return {
      name,
      loadings: sheet(indicators, factorNames, 'loading'),
      regressions: sheet(factorNames, factorNames, 'factor regression'),
      factorCovariances: sheet(factorNames, factorNames, 'factor covariance', 'factor variance'),
      residualCovariances: sheet(indicators, indicators, 'residual covariance', 'residual variance'),
      intercepts: this.frame.means ? indicators.map((i) => cell('intercept', [i])) : null,
      factorMeans: this.frame.means ? factorNames.map((f) => cell('factor mean', [f])) : null
    }
  }
}
