import { Clock } from '../../runtime/realtime/clock.js';
import { Histogram } from '../../runtime/realtime/histogram.js';
import { type StageMeter, stages } from '../../runtime/tick.js';

/** Measures each stage of the tick on the loop thread, without allocation. */
export class StageClock implements StageMeter {
  private readonly clock = new Clock();
  private readonly times = new Float64Array(3);
  private readonly histograms = stages.map(() => new Histogram());
  private readonly whole = new Histogram();
  private began = 0;

  begin(): void {
    this.clock.now(this.times, 0);
    this.times[2] = this.times[0]!;
    this.began = 1;
  }

  end(stage: number): void {
    const { times } = this;
    this.clock.now(times, 1);
    const now = times[1]!;
    times[1] = now - times[0]!;
    this.histograms[stage]!.record(times, 1);
    times[0] = now;
    if (stage === stages.length - 1) {
      times[1] = now - times[2]!;
      this.whole.record(times, 1);
    }
  }

  reset(): void {
    for (const histogram of this.histograms) histogram.reset();
    this.whole.reset();
  }

  /** Medians and worst values, µs. */
  summary(): { stage: string; p50: number; p99: number; max: number }[] {
    if (this.began === 0) return [];
    const row = (stage: string, histogram: Histogram) => {
      const { p50, p99, max } = histogram.summary();
      return { stage, p50, p99, max };
    };
    return [...stages.map((stage, i) => row(stage, this.histograms[i]!)), row('whole tick', this.whole)];
  }
}
