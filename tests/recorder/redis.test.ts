import { type ChildProcess, spawn, spawnSync } from 'node:child_process'
import { existsSync, mkdirSync, mkdtempSync, readdirSync, rmSync, statSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, describe, expect, it, vi } from 'vitest'
import { misread } from '../cli/in-process.js'

const hasRedis = spawnSync('redis-server', ['--version']).status === 0
const folder = mkdtempSync(join(tmpdir(), 'misread-recording-'))
afterAll(() => rmSync(folder, { recursive: true, force: true }))

/** The script as a process of its own, whose temporary folders stand in `temporary`. */
function script(reads: string, temporary: string, ...more: string[]): { out: string; child: ChildProcess } {
  mkdirSync(temporary, { recursive: true })
  const out = join(folder, `${reads}-${readdirSync(folder).length}.ndjson`)
  const args = ['--import', 'tsx', 'histories/record-redis.ts', '--reads', reads, '--out', out, ...more]
  const env = { ...process.env, TMPDIR: temporary }
  return { out, child: spawn(process.execPath, args, { env, stdio: ['ignore', 'inherit', 'pipe'] }) }
}

const exited = (child: ChildProcess): Promise<number | null> =>
  new Promise((resolve) => child.once('exit', (code) => resolve(code)))

/** The servers of a script that is running, by their process ids. */
async function serversOf(child: ChildProcess): Promise<number[]> {
  let ids: number[] = []
  await vi.waitFor(() => {
    const { stdout } = spawnSync('pgrep', ['-P', `${child.pid}`, 'redis-server'], { encoding: 'utf8' })
    ids = stdout.split('\n').filter(Boolean).map(Number)
    expect(ids).toHaveLength(2)
  }, 20_000)
  return ids
}

function isRunning(id: number): boolean {
  try {
    return process.kill(id, 0)
  } catch {
    return false
  }
}
const recordingFolders = (temporary: string): string[] =>
  readdirSync(temporary).filter((name) => name.startsWith('misread-redis-'))

describe.skipIf(!hasRedis)('a real Redis, recorded now (skipped where there is no redis-server)', () => {
  it('everything through the primary holds, whatever is done to the replica', async () => {
    const { out: file, child } = script('primary', join(folder, 'tmp'), '--operations', '4000')
    const ended = exited(child)
    const servers = await serversOf(child)
    expect(await ended).toBe(0)
    const { status, out } = await misread(['check', file])
    expect(status, out).toBe(0)
    await vi.waitFor(() => expect(servers.filter(isRunning)).toEqual([]), 5000)
    expect(recordingFolders(join(folder, 'tmp'))).toEqual([])
  })

  it('reads from the replica are decided, and the recording has its marks and its closing reads', async () => {
    const { out: file, child } = script('replica', join(folder, 'tmp'), '--seconds', '2')
    expect(await exited(child)).toBe(0)
    const { status, out } = await misread(['check', file, '--format', 'json'])
    // Whether a read is stale is up to the machine; that it is decided is not.
    expect([0, 1]).toContain(status)
    const result = JSON.parse(out)
    expect(result.promises[0].undecided).toBe(0)
    expect(result.history.operations).toBeGreaterThan(500)
    expect(result.history.unsure).toBe(0)
    expect(result.history.hosts).toBe(1)
    expect(result.history.clients).toBe(24 + 2)
    expect(result.history.marks).toBeGreaterThan(2)
  })

  it.each(['SIGTERM', 'SIGINT', 'SIGHUP'] as const)(
    '%s in the middle leaves no server, no folder, and a recording that reads',
    async (signal) => {
      const temporary = join(folder, signal)
      const { out, child } = script('replica', temporary)
      const ended = exited(child)
      const servers = await serversOf(child)
      await vi.waitFor(() => expect(existsSync(out) && statSync(out).size).toBeGreaterThan(50_000), 20_000)
      child.kill(signal)
      expect(await ended).toBe({ SIGHUP: 129, SIGINT: 130, SIGTERM: 143 }[signal])
      await vi.waitFor(() => expect(servers.filter(isRunning)).toEqual([]), 5000)
      expect(recordingFolders(temporary)).toEqual([])
      const { status, err } = await misread(['survey', out])
      expect(status, err).toBe(0)
    },
  )

  it('an error leaves no server and no folder', async () => {
    const temporary = join(folder, 'error')
    const existing = join(folder, 'existing.ndjson')
    writeFileSync(existing, '')
    const { child } = script('primary', temporary, '--out', existing)
    let said = ''
    child.stderr?.on('data', (chunk) => {
      said += chunk
    })
    const ended = exited(child)
    const servers = await serversOf(child)
    expect(await ended).toBe(1)
    expect(said).toContain('exists already')
    await vi.waitFor(() => expect(servers.filter(isRunning)).toEqual([]), 5000)
    expect(recordingFolders(temporary)).toEqual([])
  })
})
