/**
 * The certificate of a check, written claim by claim as keys are decided; it appears whole or not at all.
 */
import { causalClaim, headerLine, keyClaims } from '../certificates/certify.js'
import type { ClaimLine } from '../certificates/schema.js'
import type { Budget } from '../deciders/search/budget.js'
import type { CheckRequest } from '../findings/check.js'
import type { History } from '../history/columns.js'
import type { PromiseRequest } from '../promises/request.js'
import { sha256Of } from './digests.js'
import { UsageError } from './exit.js'
import { WholeOutput } from './whole-output.js'

interface Asked {
  readonly promises: readonly PromiseRequest[]
  readonly clockErrorNs?: bigint
  readonly keys?: readonly string[]
  newBudget(): Budget
}

export class CertificateFile {
  readonly listeners: Pick<CheckRequest, 'onKey' | 'onCausal'>
  readonly #output: WholeOutput
  /** promises over all keys that nothing was said about yet */
  readonly #untold: Set<string>
  #claims = 0

  /** Throws UsageError where the file cannot be written, or an input is no file whose digest could be compared. */
  static async start(path: string, force: boolean, history: History, asked: Asked): Promise<CertificateFile> {
    const inputs = history.files.map(({ name }) => name)
    if (inputs.includes('-'))
      throw new UsageError('a certificate is about files: give the history as one, not on standard input')
    const output = await WholeOutput.start(path, force, inputs)
    try {
      const digests: string[] = []
      for (const input of inputs) digests.push(await sha256Of(input))
      const clockErrorNs = asked.clockErrorNs ?? history.clockErrorNs
      const header = headerLine(history, asked.promises, clockErrorNs, digests, asked.keys)
      await output.write(`${JSON.stringify(header)}\n`)
    } catch (error) {
      await output.discard()
      throw error
    }
    return new CertificateFile(output, history, asked)
  }

  private constructor(output: WholeOutput, history: History, asked: Asked) {
    this.#output = output
    this.#untold = new Set(asked.promises.filter(({ causal }) => causal).map(({ name }) => name))
    this.listeners = {
      onKey: async (key, decided) => {
        for (const claim of keyClaims(key, decided, asked.newBudget)) await this.#write(claim)
      },
      onCausal: async (promise, index, found) => {
        this.#untold.delete(promise.name)
        await this.#write(causalClaim(history, index, promise, asked.keys, found))
      },
    }
  }

  async #write(claim: ClaimLine): Promise<void> {
    this.#claims++
    await this.#output.write(`${JSON.stringify(claim)}\n`)
  }

  /** Writes the last lines and gives the file its name. What an interrupted check did not come to is undecided. */
  async commit(): Promise<void> {
    for (const name of this.#untold) await this.#write({ claim: 'undecided', promises: [name] })
    await this.#output.write(`${JSON.stringify({ end: true, claims: this.#claims })}\n`)
    await this.#output.commit()
  }

  /** Leaves nothing behind. */
  discard(): Promise<void> {
    return this.#output.discard()
  }
}
