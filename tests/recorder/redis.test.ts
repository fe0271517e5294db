import { execFileSync, spawnSync } from 'node:child_process'
import { mkdtempSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, describe, expect, it } from 'vitest'
import { misread } from '../cli/in-process.js'

const hasRedis = spawnSync('redis-server', ['--version']).status === 0
const folder = mkdtempSync(join(tmpdir(), 'misread-redis-test-'))
afterAll(() => rmSync(folder, { recursive: true, force: true }))

describe.skipIf(!hasRedis)('a real Redis, recorded now (skipped where there is no redis-server)', () => {
  const record = (reads: string): string => {
    const out = join(folder, `${reads}.ndjson`)
    execFileSync(
      'npx',
      ['tsx', 'histories/record-redis.ts', '--reads', reads, '--operations', '6000', '--out', out],
      {
        stdio: 'inherit',
      },
    )
    return out
  }

  it('everything through the primary holds', async () => {
    const { status, out } = await misread(['check', record('primary')])
    expect(status, out).toBe(0)
  })

  it('reads from the replica are decided, and the recording has its marks', async () => {
    const path = record('replica')
    const { status, out } = await misread(['check', path, '--format', 'json'])
    // Whether a read is stale is up to the machine; that it is decided is not.
    expect([0, 1]).toContain(status)
    const result = JSON.parse(out)
    expect(result.promises[0].undecided).toBe(0)
    expect(result.history.operations).toBeGreaterThanOrEqual(6000)
    expect(result.history.marks).toBeGreaterThan(0)
  })

  it('leaves no server behind', () => {
    expect(spawnSync('pgrep', ['-f', 'misread-redis-'], { encoding: 'utf8' }).stdout).toBe('')
  })
})
