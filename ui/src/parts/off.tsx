// "Outputs off": asks nothing, always tries. Filled while there is something to switch off.
import type { BenchModel } from "../data/bench";
import { watcherWords } from "../data/bench";

export function OutputsOff({ bench, brief }: { bench: BenchModel; brief: readonly string[] }) {
  const v = bench.vitals.value;
  const confirmed = bench.link.value.state === "live" && v?.energised === "no";
  const may = bench.mayControl.value;
  const [first, second] = brief;
  return (
    <div class="offbox">
      <span class="brief">{first}{second && <><br />{second}</>}</span>
      <button
        type="button"
        class={confirmed || !may ? "off again" : "off"}
        aria-disabled={may ? undefined : "true"}
        aria-describedby={may ? undefined : "off-why"}
        onClick={() => void bench.switchOff()}
      >
        Outputs off
      </button>
      {!may && <span class="spoken" id="off-why">{watcherWords}</span>}
    </div>
  );
}
