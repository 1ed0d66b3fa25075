import type { FaultKind } from '../errors/stillmark-error.js'

/** 0 agreement or decided, 1 disagreement, 2 bad input, 3 undecided, 4 limit, 70 defect of the program, 130 interrupted. */
export type ExitStatus = 0 | 1 | 2 | 3 | 4 | 70 | 130

export const statusOfFault = (kind: FaultKind): ExitStatus =>
  kind === 'input' ? 2 : kind === 'limit' ? 4 : kind === 'interrupted' ? 130 : 70

/** The order in which one ending hides another. A defect hides all but an interruption: nothing after it can be trusted. */
const hides: readonly ExitStatus[] = [130, 70, 2, 4, 1, 3, 0]

/** The status of several files: the first of that order that occurred. */
export const joinedStatus = (statuses: readonly ExitStatus[]): ExitStatus =>
  hides.find((status) => statuses.includes(status)) ?? 0
