import progressBars, { type SingleBar } from "cli-progress";
import type { Progress } from "../tuning/session.js";

export type ShowProgress = (progress: Progress) => void;

export interface ProgressDisplay {
  readonly show: ShowProgress;
  /** Leaves the terminal as it was. */
  readonly stop: () => void;
}

/** What a display draws on: standard error, or a stand-in for it. */
export interface Screen {
  readonly isTTY?: boolean;
  write(text: string): unknown;
}

const betweenStages = 250;
const withinStage = 2000;
const barWidth = 24;

/**
 * Progress lines where nobody looks at a terminal: one as a stage begins (of stages shorter than a quarter second
 * not every one), then one every two seconds at most.
 *
 * @param now - a clock [ms].
 */
export function lineDisplay(screen: Screen, now: () => number = Date.now): ProgressDisplay {
  let stage = "";
  let shownAt = Number.NEGATIVE_INFINITY;
  const show = (progress: Progress): void => {
    const waited = now() - shownAt;
    if (waited < (progress.stage === stage ? withinStage : betweenStages)) return;
    stage = progress.stage;
    shownAt = now();
    screen.write(`${stage}${countText(progress)}\n`);
  };
  return { show, stop: () => undefined };
}

function countText({ done, total }: Progress): string {
  if (total !== null) return ` ${done}/${total}`;
  return done > 0 ? ` ${done}` : "";
}

/** A bar on a terminal that moves with the current stage and is gone at the end. */
function barDisplay(): ProgressDisplay {
  const bar: SingleBar = new progressBars.SingleBar(
    {
      format: (_options, { startTime }, progress: Progress) => barText(progress, Date.now() - startTime),
      clearOnComplete: true,
      hideCursor: true,
      gracefulExit: false,
    },
    progressBars.Presets.shades_classic,
  );
  bar.start(1, 0, { stage: "starting", done: 0, total: null });
  return { show: (progress) => bar.update(progress), stop: () => bar.stop() };
}

/** One line for a terminal: a bar where the stage's length is known, the stage, its count, the time so far. */
export function barText(progress: Progress, elapsed: number): string {
  const { stage, done, total } = progress;
  const full = total === null ? 0 : Math.round((barWidth * Math.min(done, total)) / Math.max(total, 1));
  const bar = total === null ? "" : `${"█".repeat(full)}${"░".repeat(barWidth - full)} `;
  return `${bar}${stage}${countText(progress)}, ${Math.round(elapsed / 1000)} s`;
}

const silent: ProgressDisplay = { show: () => undefined, stop: () => undefined };

export function progressDisplay(quiet: boolean): ProgressDisplay {
  if (quiet) return silent;
  return process.stderr.isTTY ? barDisplay() : lineDisplay(process.stderr);
}
