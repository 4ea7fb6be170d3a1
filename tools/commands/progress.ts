import { Presets, SingleBar } from 'cli-progress';

/** A progress bar on standard error that goes quiet where there is no terminal, and a signal that Ctrl-C sets. */
export class Progress {
  private readonly bar: SingleBar;
  private readonly controller = new AbortController();
  private readonly onSignal = () => this.controller.abort();
  private shown = false;

  constructor(
    title: string,
    private readonly quiet = false,
  ) {
    this.bar = new SingleBar(
      {
        format: `${title} {bar} {percentage} %`,
        hideCursor: true,
        clearOnComplete: true,
        stream: process.stderr,
        barsize: 30,
        noTTYOutput: false,
        gracefulExit: false,
      },
      Presets.legacy,
    );
    process.on('SIGINT', this.onSignal);
    process.on('SIGTERM', this.onSignal);
  }

  get signal(): AbortSignal {
    return this.controller.signal;
  }

  /** Share done, 0 to 1; false when the work is to stop. */
  update(share: number): boolean {
    if (!this.quiet && process.stderr.isTTY) {
      if (!this.shown) this.bar.start(100, 0);
      this.shown = true;
      this.bar.update(Math.min(100, Math.round(100 * share)));
    }
    return !this.controller.signal.aborted;
  }

  done(): void {
    if (this.shown) this.bar.stop();
    process.off('SIGINT', this.onSignal);
    process.off('SIGTERM', this.onSignal);
  }
}
