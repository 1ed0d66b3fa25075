/** Rules that `warm-up` may name, in the file and on the command line. */
export const warmUpRules = ['auto', 'mser'] as const
