import { Session } from 'node:inspector';

interface Block {
  readonly startOffset: number;
  readonly endOffset: number;
  readonly count: number;
}
interface Result {
  readonly result: readonly {
    readonly scriptId: string;
    readonly url: string;
    readonly functions: readonly { readonly ranges: readonly Block[] }[];
  }[];
}

/** What a look found: characters of the code that ran for the first time, and how to count them as known. */
export interface Fresh {
  readonly count: number;
  mark(): void;
}

/**
 * Which of the project's own code ran since the last look, by V8's block counters. Blocks come and go with their counts
 * (one that ran as often as what is around it is not listed), so it is kept by character of the text.
 */
export class Coverage {
  private readonly known = new Map<string, Uint8Array>();
  private readonly session = new Session();

  constructor(private readonly own = /\/(runtime|bridge|configs)\/.*\.(js|ts)$/) {
    this.session.connect();
    this.ask('Profiler.enable');
    this.ask('Profiler.startPreciseCoverage', { callCount: true, detailed: true });
    this.take().mark();
  }

  /** What ran since the last call and is not known. */
  take(): Fresh {
    const painted: { readonly known: Uint8Array; readonly now: Uint8Array }[] = [];
    let count = 0;
    const { result } = this.ask('Profiler.takePreciseCoverage') as Result;
    for (const { scriptId, url, functions } of result) {
      if (!this.own.test(url)) continue;
      let length = 0;
      for (const { ranges } of functions) length = Math.max(length, ranges[0]!.endOffset);
      const now = new Uint8Array(length);
      // from the outside in: what is inside says better
      for (const { ranges } of functions)
        for (const range of ranges) now.fill(range.count > 0 ? 1 : 0, range.startOffset, range.endOffset);
      let known = this.known.get(scriptId);
      if (known === undefined || known.length < length) {
        const longer = new Uint8Array(length);
        if (known !== undefined) longer.set(known);
        known = longer;
        this.known.set(scriptId, known);
      }
      let fresh = 0;
      for (let at = 0; at < length; at += 1) fresh += now[at]! & (known[at]! ^ 1);
      count += fresh;
      if (fresh > 0) painted.push({ known, now });
    }
    return {
      count,
      mark: () => {
        for (const { known, now } of painted)
          for (let at = 0; at < now.length; at += 1) known[at] = known[at]! | now[at]!;
      },
    };
  }

  close(): void {
    this.ask('Profiler.stopPreciseCoverage');
    this.session.disconnect();
  }

  private ask(method: string, parameters: object = {}): unknown {
    let answer: unknown;
    // in the same thread it is answered before it returns
    this.session.post(method, parameters, (error, result) => {
      if (error) throw error;
      answer = result;
    });
    return answer;
  }
}
