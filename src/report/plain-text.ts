/**
 * A stranger's text as one line that can be shown anywhere: without control characters, escape sequences, or characters
 * that turn the direction of writing.
 */
export function plainText(text: string, longest = 200): string {
  const line = text
    .replace(/[\r\n\t]+/g, ' ')
    .replace(/\p{Cc}|[\u200B-\u200F\u202A-\u202E\u2060-\u2069\uFEFF]/gu, '')
    .trim()
  const characters = [...line]
  return characters.length > longest ? `${characters.slice(0, longest - 1).join('')}…` : line
}
