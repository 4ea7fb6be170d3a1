import type { Acknowledgement, Hand, HandCommand, LiveSource } from './source.js';

interface Grip {
  readonly owner: object;
  readonly who: string;
  readonly hand: Hand;
  /** ms, host clock, by which it must be renewed; Infinity without a dead man. */
  renewBy: number;
}

/**
 * Every hand on the bench goes through here: what may be touched, within which range, by whom, and what lets go when
 * nobody renews it. A hand with a dead man is released when its page is silent, slow or gone.
 */
export class Hands {
  private readonly grips = new Map<string, Grip>();

  constructor(
    private readonly source: LiveSource,
    private readonly now: () => number,
  ) {}

  get held(): number {
    return this.grips.size;
  }

  async act(owner: object, command: HandCommand, hand: Hand): Promise<Acknowledgement> {
    if (this.source.command === undefined)
      return refused('the bench was started without control; start it with --control');
    if (command.kind === 'set') {
      const wrong = this.take(owner, command.path, command.value, hand);
      if (wrong !== undefined) return refused(wrong);
    } else if (command.kind === 'release') {
      const grip = this.grips.get(command.path);
      if (grip === undefined) return refused(`nobody holds ${command.path}`);
      if (grip.owner !== owner) return refused(`${command.path} is held by ${grip.who}`);
      this.grips.delete(command.path);
    }
    return this.source.command(command, hand);
  }

  /** The reason why not, or undefined once it is held. */
  private take(owner: object, path: string, value: number, hand: Hand): string | undefined {
    const facts = this.source.bench.hands.find((candidate) => candidate.path === path);
    if (facts === undefined) return `${path} is nothing that a hand may set on this bench`;
    if (!(value >= facts.least && value <= facts.most)) {
      return `${path} = ${value} ${facts.unit} is outside ${facts.least} .. ${facts.most} ${facts.unit}`;
    }
    const grip = this.grips.get(path);
    if (grip !== undefined && grip.owner !== owner) return `${path} is held by ${grip.who}; it has to let go first`;
    const renewBy = facts.deadMan === undefined ? Number.POSITIVE_INFINITY : this.now() + facts.deadMan * 1000;
    if (value === facts.rest && facts.deadMan === undefined) this.grips.delete(path);
    else this.grips.set(path, { owner, who: hand.who, hand, renewBy });
    return undefined;
  }

  /** To be called some ten times a second: lets go of what nobody renewed. */
  expire(): void {
    const now = this.now();
    for (const [path, grip] of this.grips)
      if (now > grip.renewBy) this.letGo(path, grip, 'dead man: not renewed in time');
  }

  /** The owner's connection is gone. */
  leave(owner: object): void {
    for (const [path, grip] of this.grips)
      if (grip.owner === owner) this.letGo(path, grip, 'the page that held it is gone');
  }

  private letGo(path: string, grip: Grip, reason: string): void {
    this.grips.delete(path);
    void this.source.command?.({ kind: 'release', path, reason }, { ...grip.hand, at: this.now() });
  }
}

function refused(text: string): Acknowledgement {
  return { ok: false, tick: -1, text };
}
