// The marks of parts on a staff, each about 24 px high, in pencil.
import type { SchematicPart } from "../data/nouns";

/** `up`: the part's first terminal, a diode's anode, is the lower one. */
export function Mark({ part, x, y, up }: { part: SchematicPart; x: number; y: number; up: boolean }) {
  switch (part.kind) {
    case "resistor": return <rect class="body" x={x - 4.5} y={y - 11} width={9} height={22} />;
    case "pot": return (
      <g>
        <rect class="body" x={x - 4.5} y={y - 11} width={9} height={22} />
        {part.terminals.length > 2 ? <path class="wire" d={`M${x - 5} ${y}l-5 -3m5 3l-5 3`} /> : <path class="wire" d={`M${x - 11} ${y + 9}L${x + 11} ${y - 9}m-5 0.5h5v5`} />}
      </g>
    );
    case "capacitor": return <g><rect class="clear" x={x - 8} y={y - 3} width={16} height={6} /><path class="wire" d={`M${x - 8} ${y - 3}h16M${x - 8} ${y + 3}h16`} /></g>;
    case "diode": {
      const s = up ? -1 : 1; // the way the arrow points
      return <path class="body" d={`M${x - 6} ${y - 5 * s}h12l-6 ${10 * s}zM${x - 6} ${y + 5 * s}h12`} />;
    }
    case "motor": return <g><circle class="body" cx={x} cy={y} r={10.5} /><text class="lab" x={x} y={y + 4.5} text-anchor="middle">M</text></g>;
    case "source": return <g><circle class="body" cx={x} cy={y} r={9} /><path class="wire" d={`M${x - 3} ${y - 3}h6m-3 -3v6M${x - 3} ${y + 4.5}h6`} /></g>;
    case "timer": return <rect class="body" x={x - 6} y={y - 15} width={12} height={30} />;
    default: return <g><rect class="clear" x={x - 2} y={y - 9} width={4} height={18} /><path class="wire" d={`M${x} ${y + 9}L${x - 8} ${y - 8}`} /></g>; // a switch: the transistor
  }
}
