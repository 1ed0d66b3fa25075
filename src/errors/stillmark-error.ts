/** Where a fault stands: line and column from 1, key as in `transitions.collect.rate`. */
export interface Place {
  readonly file?: string
  readonly line?: number
  readonly column?: number
  readonly key?: string
}

/** One thing that is wrong: data first, the sentence is made from it. */
export interface Fault {
  /** Stable, hyphenated: `unknown-name`. */
  readonly code: string
  readonly where?: Place
  /** The offending text as it stands in the file, shortened where it is long. */
  readonly text?: string
  /** What is wrong, one sentence. */
  readonly what: string
  /** What is allowed or what to do, one sentence. */
  readonly next?: string
}

/** What kind of ending the fault is; the command line makes the exit status from it. */
export type FaultKind = 'input' | 'limit' | 'interrupted' | 'internal'

/**
 * The one error class. Holds every fault found, not the first only; `code`, `where`, `what` and `next` are those of
 * the first.
 */
export class StillmarkError extends Error {
  readonly kind: FaultKind
  readonly faults: readonly Fault[]

  constructor(fault: Fault | readonly Fault[], kind: FaultKind = 'input') {
    const faults = Array.isArray(fault) ? (fault as readonly Fault[]) : [fault as Fault]
    super(faults.map(sentenceOf).join('\n'))
    this.name = 'StillmarkError'
    this.kind = kind
    this.faults = faults
  }

  get code(): string {
    return this.faults[0].code
  }
  get where(): Place | undefined {
    return this.faults[0].where
  }
  get what(): string {
    return this.faults[0].what
  }
  get next(): string | undefined {
    return this.faults[0].next
  }
}

/** `lockers.yaml:12:24  "occuped" is not a constant, quantity or state variable. Did you mean "occupied"?` */
export function sentenceOf(fault: Fault): string {
  const { file, line, column, key } = fault.where ?? {}
  const spot = [file, line, line === undefined ? undefined : column].filter((part) => part !== undefined).join(':')
  const place = [spot, key === undefined ? '' : `(${key})`].filter((part) => part !== '').join(' ')
  return `${place === '' ? '' : `${place}  `}${fault.what}${fault.next === undefined ? '' : ` ${fault.next}`}`
}
