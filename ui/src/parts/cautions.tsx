// The cautions at the foot of every view.
const usual = [
  "“Outputs off” switches the supply off through the instrument and reads it back. It is no emergency stop: that is the mains switch at the bench.",
  "Motor secured and guarded, nothing flammable near, inline fuse fitted. Local rules and licensed practice come first.",
];

export function Cautions({ said }: { said: readonly string[] }) {
  return <footer><p>{(said.length ? said : usual).join(" ")}</p></footer>;
}
