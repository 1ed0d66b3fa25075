/**
 * Jumps a second of `simulate` on an enumerated chain of 1,000 states with its statistics on, against a plain loop in C
 * of the same kind: the same generator, -log(u) for the holding time, a search through the cumulative rates.
 */
import { execFileSync } from 'node:child_process'
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { simulate } from '../../src/simulation/simulate.js'
import { ringChain } from '../simulation/hand-made-chain.js'
import type { BenchRow } from './row.js'

const states = 1000
const repeats = 5

const million = (perSecond: number) => `${(perSecond / 1e6).toFixed(1)} million jumps/s`
const median = (numbers: readonly number[]) => [...numbers].sort((a, b) => a - b)[numbers.length >> 1]
const spreadOf = (numbers: readonly number[]) => {
  const middle = median(numbers)
  return `${Math.round((100 * (Math.max(...numbers) - Math.min(...numbers))) / middle)} %`
}

export async function simulationBench(): Promise<BenchRow[]> {
  const rows: BenchRow[] = []
  const inC = plainLoopInC()
  for (const time of ['continuous', 'discrete'] as const) {
    const { model, chain } = ringChain(states, time)
    for (const workers of [1, 2]) {
      const settings = { seed: 'bench', replications: 4, warmUp: 0, runLength: 1e7, batches: 32 }
      const speeds: number[] = []
      for (let repeat = 0; repeat < repeats; repeat++) {
        const { events, seconds } = await simulate(model, chain, settings, { workers })
        speeds.push(events / seconds)
      }
      const ours = median(speeds)
      const held = time === 'continuous' && workers === 1 ? inC : undefined
      rows.push({
        what: `enumerated chain, ${time} time, ${workers} ${workers === 1 ? 'worker' : 'workers'}`,
        size: `${states.toLocaleString('en-US')} states, 3 arcs each, 4 measures`,
        ours: million(ours),
        yardstick:
          held === undefined
            ? time === 'continuous' && workers === 1
              ? 'plain loop in C: absent, no gcc here'
              : '20 million jumps/s and core aimed at'
            : `plain loop in C: ${million(held)}`,
        ratio: held === undefined ? ours / (20e6 * workers) : ours / held,
        spread: spreadOf(speeds),
      })
    }
  }
  return rows
}

const plainLoop = `
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <time.h>
static uint32_t s[4] = {1, 2, 3, 4};
static uint32_t rotl(uint32_t x, int k) { return (x << k) | (x >> (32 - k)); }
static uint32_t next(void) {
  uint32_t r = rotl(s[0] + s[3], 7) + s[0], t = s[1] << 9;
  s[2] ^= s[0]; s[3] ^= s[1]; s[1] ^= s[2]; s[0] ^= s[3]; s[2] ^= t; s[3] = rotl(s[3], 11);
  return r;
}
static double uniform(void) { uint32_t h = next() >> 5; return (h * 67108864.0 + (next() >> 6) + 1) * 0x1p-53; }
enum { n = ${states} };
static double rate[n][3], timeIn[n];
static int target[n][3];
static long fired[n][3];
int main(void) {
  for (int i = 0; i < n; i++) {
    int to[3] = {(i + 1) % n, (i + n - 1) % n, (i + 7) % n};
    for (int k = 0; k < 3; k++) { target[i][k] = to[k]; rate[i][k] = 0.2 + 0.1 * ((i * 3 + k * 5) % 7); }
  }
  clock_t begin = clock();
  long events = 40000000;
  int state = 0;
  double now = 0;
  for (long e = 0; e < events; e++) {
    double total = rate[state][0] + rate[state][1] + rate[state][2];
    double hold = -log(uniform()) / total;
    timeIn[state] += hold; now += hold;
    double rest = uniform() * total;
    int k = 0;
    while (k < 2 && rest > rate[state][k]) rest -= rate[state][k++];
    fired[state][k]++;
    state = target[state][k];
  }
  double seconds = (double)(clock() - begin) / CLOCKS_PER_SEC;
  printf("%g %g %ld\\n", events / seconds, timeIn[0] / now, fired[0][0]);
}
`

/** Jumps a second, undefined where there is no gcc. */
function plainLoopInC(): number | undefined {
  const folder = mkdtempSync(join(tmpdir(), 'bench-'))
  try {
    const source = join(folder, 'loop.c')
    writeFileSync(source, plainLoop)
    execFileSync('gcc', ['-O2', '-o', join(folder, 'loop'), source, '-lm'], { stdio: 'ignore' })
    const speeds = Array.from({ length: 3 }, () => Number(execFileSync(join(folder, 'loop')).toString().split(' ')[0]))
    return median(speeds)
  } catch {
    return undefined
  } finally {
    rmSync(folder, { recursive: true, force: true })
  }
}
