import { createToken, EmbeddedActionsParser, type IToken, Lexer } from 'chevrotain'
import { type Fraction, fractionOfText } from '../numbers/fraction.js'
import type { ArithmeticOperator, Comparison } from './expression.js'

/** An expression as it is written: names not yet looked up. `at` is the offset in its text. */
export type Syntax = { readonly at: number } & (
  | { readonly kind: 'number'; readonly value: Fraction }
  | { readonly kind: 'truth'; readonly value: boolean }
  | { readonly kind: 'name'; readonly name: string; readonly index?: readonly Syntax[] }
  | { readonly kind: 'call'; readonly name: string; readonly args: readonly Syntax[] }
  | { readonly kind: 'negate' | 'not'; readonly of: Syntax }
  | { readonly kind: 'arithmetic'; readonly op: ArithmeticOperator; readonly left: Syntax; readonly right: Syntax }
  | { readonly kind: 'compare'; readonly op: Comparison; readonly left: Syntax; readonly right: Syntax }
  | { readonly kind: 'logic'; readonly op: 'and' | 'or'; readonly left: Syntax; readonly right: Syntax }
)

/** What is wrong with an expression's text, and where in it. */
export interface SyntaxFault {
  readonly at: number
  readonly what: string
  readonly next: string
}

/** Longest text and deepest nesting that are read: far above what people write, far below what exhausts a stack. */
export const longestExpression = 10_000
const deepestNesting = 150

const Blank = createToken({ name: 'Blank', pattern: /\s+/, group: Lexer.SKIPPED })
const NumberLiteral = createToken({ name: 'NumberLiteral', pattern: /(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?/ })
const Name = createToken({ name: 'Name', pattern: /[A-Za-z][A-Za-z0-9_]*/ })
const word = (name: string, pattern: RegExp) => createToken({ name, pattern, longer_alt: Name })
const And = word('And', /and/)
const Or = word('Or', /or/)
const Not = word('Not', /not/)
const True = word('True', /true/)
const False = word('False', /false/)
const Comparator = createToken({ name: 'Comparator', pattern: /<=|>=|==|!=|<|>/ })
const PlusMinus = createToken({ name: 'PlusMinus', pattern: /[+-]/ })
const TimesOver = createToken({ name: 'TimesOver', pattern: /[*/%]/ })
const Power = createToken({ name: 'Power', pattern: /\^/ })
const Open = createToken({ name: 'Open', pattern: /\(/ })
const Close = createToken({ name: 'Close', pattern: /\)/ })
const OpenIndex = createToken({ name: 'OpenIndex', pattern: /\[/ })
const CloseIndex = createToken({ name: 'CloseIndex', pattern: /\]/ })
const Comma = createToken({ name: 'Comma', pattern: /,/ })

const tokens = [
  Blank, NumberLiteral, And, Or, Not, True, False, Name, Comparator, PlusMinus, TimesOver, Power, Open, Close, OpenIndex,
  CloseIndex, Comma,
] // biome-ignore format: one table of tokens

const lexer = new Lexer(tokens, { positionTracking: 'onlyOffset' })

/** Operators of other languages, and what they are called here. */
const otherWords: readonly (readonly [pattern: RegExp, next: string])[] = [
  [/^===/, 'Write == to compare.'],
  [/^!==/, 'Write != for "is not equal".'],
  [/^&&?/, 'Write "and".'],
  [/^\|\|?/, 'Write "or".'],
  [/^\*\*/, 'Write ^ for a power.'],
  [/^=/, 'Write == to compare.'],
  [/^!/, 'Write "not".'],
  [/^[?]/, 'Write if(condition, a, b).'],
  [/^[{}]/, 'Braces have no meaning in an expression; round brackets group.'],
]

class ExpressionParser extends EmbeddedActionsParser {
  constructor() {
    super(tokens, { recoveryEnabled: false, maxLookahead: 2 })
    this.performSelfAnalysis()
  }

  readonly whole = this.RULE('whole', (): Syntax => this.SUBRULE(this.either))

  private readonly either = this.RULE('either', (): Syntax => {
    let left = this.SUBRULE(this.both)
    this.MANY(() => {
      const at = this.CONSUME(Or).startOffset
      const right = this.SUBRULE2(this.both)
      left = { kind: 'logic', op: 'or', left, right, at }
    })
    return left
  })

  private readonly both = this.RULE('both', (): Syntax => {
    let left = this.SUBRULE(this.negation)
    this.MANY(() => {
      const at = this.CONSUME(And).startOffset
      const right = this.SUBRULE2(this.negation)
      left = { kind: 'logic', op: 'and', left, right, at }
    })
    return left
  })

  private readonly negation = this.RULE(
    'negation',
    (): Syntax =>
      this.OR([
        {
          ALT: (): Syntax => {
            const at = this.CONSUME(Not).startOffset
            return { kind: 'not', of: this.SUBRULE(this.negation), at }
          },
        },
        { ALT: (): Syntax => this.SUBRULE(this.comparison) },
      ]),
  )

  private readonly comparison = this.RULE('comparison', (): Syntax => {
    const left = this.SUBRULE(this.sum)
    return (
      this.OPTION((): Syntax => {
        const token = this.CONSUME(Comparator)
        const right = this.SUBRULE2(this.sum)
        return { kind: 'compare', op: token.image as Comparison, left, right, at: token.startOffset }
      }) ?? left
    )
  })

  private readonly sum = this.RULE('sum', (): Syntax => {
    let left = this.SUBRULE(this.product)
    this.MANY(() => {
      const token = this.CONSUME(PlusMinus)
      const right = this.SUBRULE2(this.product)
      left = { kind: 'arithmetic', op: token.image as ArithmeticOperator, left, right, at: token.startOffset }
    })
    return left
  })

  private readonly product = this.RULE('product', (): Syntax => {
    let left = this.SUBRULE(this.signed)
    this.MANY(() => {
      const token = this.CONSUME(TimesOver)
      const right = this.SUBRULE2(this.signed)
      left = { kind: 'arithmetic', op: token.image as ArithmeticOperator, left, right, at: token.startOffset }
    })
    return left
  })

  /** The sign stands outside a power: -2^2 is -4. */
  private readonly signed = this.RULE(
    'signed',
    (): Syntax =>
      this.OR([
        {
          ALT: (): Syntax => {
            const token = this.CONSUME(PlusMinus)
            const of = this.SUBRULE(this.signed)
            return token.image === '-' ? { kind: 'negate', of, at: token.startOffset } : of
          },
        },
        { ALT: (): Syntax => this.SUBRULE(this.raised) },
      ]),
  )

  /** Groups to the right, and an exponent may carry a sign: 2^-1. */
  private readonly raised = this.RULE('raised', (): Syntax => {
    const left = this.SUBRULE(this.atom)
    return (
      this.OPTION((): Syntax => {
        const at = this.CONSUME(Power).startOffset
        const right = this.SUBRULE(this.signed)
        return { kind: 'arithmetic', op: '^', left, right, at }
      }) ?? left
    )
  })

  private readonly atom = this.RULE(
    'atom',
    (): Syntax =>
      this.OR([
        { ALT: (): Syntax => numberOf(this.CONSUME(NumberLiteral)) },
        { ALT: (): Syntax => ({ kind: 'truth', value: true, at: this.CONSUME(True).startOffset }) },
        { ALT: (): Syntax => ({ kind: 'truth', value: false, at: this.CONSUME(False).startOffset }) },
        { ALT: (): Syntax => this.SUBRULE(this.named) },
        {
          ALT: (): Syntax => {
            this.CONSUME(Open)
            const inner = this.SUBRULE(this.either)
            this.CONSUME(Close)
            return inner
          },
        },
      ]),
  )

  private readonly named = this.RULE('named', (): Syntax => {
    const token = this.CONSUME(Name)
    const args: Syntax[] = []
    let kind: 'name' | 'call' | 'index' = 'name'
    this.OPTION(() =>
      this.OR([
        {
          ALT: () => {
            kind = 'call'
            this.CONSUME(Open)
            this.MANY_SEP({ SEP: Comma, DEF: () => args.push(this.SUBRULE(this.either)) })
            this.CONSUME(Close)
          },
        },
        {
          ALT: () => {
            kind = 'index'
            this.CONSUME(OpenIndex)
            this.AT_LEAST_ONE_SEP({ SEP: Comma, DEF: () => args.push(this.SUBRULE2(this.either)) })
            this.CONSUME(CloseIndex)
          },
        },
      ]),
    )
    const at = token.startOffset
    if ((kind as string) === 'call') return { kind: 'call', name: token.image, args, at }
    if ((kind as string) === 'index') return { kind: 'name', name: token.image, index: args, at }
    return { kind: 'name', name: token.image, at }
  })
}

/** A number too large to be kept is marked by a denominator of 0n, which no fraction has; the caller refuses it. */
function numberOf(token: IToken): Syntax {
  const value = fractionOfText(token.image) ?? { numerator: 0n, denominator: 0n }
  return { kind: 'number', value, at: token.startOffset }
}

const parser = new ExpressionParser()

/** @returns the expression, or the first thing that is wrong with it */
export function readSyntax(text: string): { readonly syntax: Syntax } | { readonly fault: SyntaxFault } {
  const fault = beforeParsing(text)
  if (fault !== undefined) return { fault }
  const { tokens: read, errors } = lexer.tokenize(text)
  if (errors.length > 0) return { fault: strange(text, errors[0].offset) }
  parser.input = read
  const syntax = parser.whole()
  const error = parser.errors[0]
  if (error !== undefined) return { fault: misplaced(text, read, error.token) }
  const large = read.find((token) => token.tokenType === NumberLiteral && fractionOfText(token.image) === undefined)
  if (large !== undefined) {
    return {
      fault: {
        at: large.startOffset,
        what: `"${shortened(large.image)}" is beyond the numbers that can be kept.`,
        next: 'Exponents may go from -400 to 400.',
      },
    }
  }
  return { syntax }
}

/** Recursion is as deep as the brackets, signs and powers that can nest: counted before anything recurses. */
function beforeParsing(text: string): SyntaxFault | undefined {
  if (text.trim() === '') return { at: 0, what: 'An expression is missing.', next: 'Write a number or a formula.' }
  if (text.length > longestExpression) {
    return {
      at: longestExpression,
      what: `The expression has ${text.length.toLocaleString('en-US')} characters.`,
      next: `At most ${longestExpression.toLocaleString('en-US')} are read: name its parts under "quantities".`,
    }
  }
  let depth = 0
  let run = 0
  for (let i = 0; i < text.length; i++) {
    const c = text[i]
    if (c === '(' || c === '[') depth++
    else if (c === ')' || c === ']') depth--
    if (c === '-' || c === '+' || c === '^') run++
    else if (c === 'n' && text.startsWith('not', i)) run++
    if (depth > deepestNesting || run > 20 * deepestNesting) {
      return { at: i, what: 'The expression nests too deeply.', next: 'Name its parts under "quantities".' }
    }
  }
  const stacked = /(?:(?:[-+^]|not\b)\s*){100,}|(?:\^[^()[\],]*){100,}/.exec(text)
  if (stacked !== null) {
    return { at: stacked.index, what: 'The expression nests too deeply.', next: 'Name its parts under "quantities".' }
  }
  return undefined
}

function strange(text: string, at: number): SyntaxFault {
  const rest = text.slice(at)
  const other = otherWords.find(([pattern]) => pattern.test(rest))
  const shown = other === undefined ? String.fromCodePoint(rest.codePointAt(0) ?? 32) : (other[0].exec(rest)?.[0] ?? '')
  return {
    at,
    what: `"${shown}" has no meaning in an expression.`,
    next:
      other?.[1] ?? 'Allowed are + - * / ^ %, comparisons, and, or, not, names, numbers, brackets and the functions.',
  }
}

function misplaced(text: string, read: readonly IToken[], token: IToken): SyntaxFault {
  const ended = Number.isNaN(token.startOffset)
  const at = ended ? text.length : token.startOffset
  const before = read.findLast((each) => each.startOffset < at)
  if (ended) {
    const open = count(text, '(') > count(text, ')') || count(text, '[') > count(text, ']')
    return {
      at,
      what: `The expression ends too early${before === undefined ? '' : `, after "${shortened(before.image)}"`}.`,
      next: open ? 'A bracket is not closed.' : 'Something is missing at its end.',
    }
  }
  if (token.tokenType === Comparator && read.some((each) => each.tokenType === Comparator && each !== token)) {
    return { at, what: 'Comparisons do not chain.', next: 'Write a < b and b < c.' }
  }
  if (token.tokenType === TimesOver && before?.image === token.image && token.image === '*') {
    return { at, what: '"**" has no meaning in an expression.', next: 'Write ^ for a power.' }
  }
  return {
    at,
    what: `"${shortened(token.image)}" can't stand here${before === undefined ? '' : `, after "${shortened(before.image)}"`}.`,
    next:
      before !== undefined &&
      (before.tokenType === NumberLiteral || before.tokenType === Name || before.tokenType === Close)
        ? 'An operator or a comma is missing, or a bracket is wrong.'
        : 'A name, a number or a bracket is expected.',
  }
}

const count = (text: string, part: string): number => text.split(part).length - 1
export const shortened = (text: string): string => (text.length > 60 ? `${text.slice(0, 57)}…` : text)
