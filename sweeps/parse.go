package sweeps

import "nightbench/instruments/userfile"

// ParseFiles reads a plan and its board from copies kept with a run: the names are
// for messages only, nothing is looked for on disk. Parts are the board's parts files.
func ParseFiles(plan, board File, parts ...File) (Plan, Board, error) {
	pf, err := userfile.Parse(plan.Name, []byte(plan.Text))
	if err != nil {
		return Plan{}, Board{}, err
	}
	bf, err := userfile.Parse(board.Name, []byte(board.Text))
	if err != nil {
		return Plan{}, Board{}, err
	}
	p := planOf(pf)
	b, boardErr := boardOf(bf)
	if err := userfile.Join(pf.Err(), boardErr); err != nil {
		return Plan{}, Board{}, err
	}
	b.Parts = parts
	return p, b, nil
}

// ParseBoard reads a board alone from a copy kept with a run, and its parts files.
func ParseBoard(board File, parts ...File) (Board, error) {
	f, err := userfile.Parse(board.Name, []byte(board.Text))
	if err != nil {
		return Board{}, err
	}
	b, err := boardOf(f)
	if err != nil {
		return Board{}, err
	}
	b.Parts = parts
	return b, nil
}
