import type { Finding } from '../comparison/verdict.js'
import type { StructurePart } from './document.js'

/** Why there is no exact answer, in a sentence. */
export function explain({ recurrence, grade, basis }: StructurePart): string {
  return recurrence === 'undetermined'
    ? `It is open whether the model has a long-run answer: ${basis}.`
    : `The model is ${recurrence} (${grade}): ${basis}.`
}

/** The finding that says that the class is open. */
export const openClass = (part: StructurePart): Finding => ({
  code: 'open-class',
  says: 'It is open whether this model has a long-run answer.',
  evidence: `${part.basis.charAt(0).toUpperCase()}${part.basis.slice(1)}. The simulated averages belong to the length of this run and may go on growing.`,
  next: 'Bound the variables that can be bounded ("to:"), or run twice as long and see whether the averages move.',
})
