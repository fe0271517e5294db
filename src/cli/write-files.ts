/**
 * Files that appear whole or not at all.
 */
import { randomBytes } from 'node:crypto'
import { mkdir, open, readdir, rename, rm } from 'node:fs/promises'
import { dirname, join } from 'node:path'
import { UsageError } from './exit.js'

/** Writes a file under a temporary name beside it, then moves it there. Creates its folder. */
export async function writeWhole(path: string, text: string): Promise<void> {
  await mkdir(dirname(path), { recursive: true })
  const temporary = `${path}.${randomBytes(6).toString('hex')}.tmp`
  try {
    const file = await open(temporary, 'wx')
    try {
      await file.writeFile(text)
      await file.sync()
    } finally {
      await file.close()
    }
    await rename(temporary, path)
  } catch (error) {
    await rm(temporary, { force: true })
    throw asUsage(error, path)
  }
}

/** Makes sure that a folder can be written to: new, empty, or `force`. Throws UsageError. */
export async function prepareFolder(folder: string, force: boolean): Promise<void> {
  const entries = await readdir(folder).catch((error: NodeJS.ErrnoException) => {
    if (error.code === 'ENOENT') return []
    throw asUsage(error, folder)
  })
  if (entries.length > 0 && !force) {
    throw new UsageError(
      `the folder ${folder} is not empty; name a new one, or add --force to write over what is in it`,
    )
  }
  if (entries.length > 0) await rm(join(folder, 'counterexamples'), { recursive: true, force: true })
}

function asUsage(error: unknown, path: string): unknown {
  const { code, message } = error as NodeJS.ErrnoException
  return code === undefined ? error : new UsageError(`cannot write ${path}: ${message}`)
}
