/** The Z3 theorem prover (de Moura and Bjørner 2008) as compiled to WebAssembly: the z3-solver package. */
import { type Context, init } from 'z3-solver'

export class Solver {
  readonly #context: Context
  readonly #end: () => void

  private constructor(context: Context, end: () => void) {
    this.#context = context
    this.#end = end
  }

  static async start(): Promise<Solver> {
    const { Context, em } = await init()
    const threads = (em as { PThread?: { terminateAllThreads(): void } }).PThread
    return new Solver(Context('main'), () => threads?.terminateAllThreads())
  }

  /** Whether the problem (SMT-LIB) has a solution; undefined where the solver gave up. `timeoutMs` bounds one question. */
  async isSatisfiable(problem: string, timeoutMs = 60_000): Promise<boolean | undefined> {
    const solver = new this.#context.Solver()
    solver.set('timeout', timeoutMs)
    solver.fromString(problem)
    const answer = await solver.check()
    solver.release()
    return answer === 'unknown' ? undefined : answer === 'sat'
  }

  end(): void {
    this.#end()
  }
}
