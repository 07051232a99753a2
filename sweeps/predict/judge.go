package predict

// StressFinding is the name of a finding about a rating; other findings have a flag's name.
const StressFinding = "stress"

// Finding is something to say about a plan before it starts.
type Finding struct {
	Name    string  `json:"name"`
	Refuse  bool    `json:"refuse"` // the plan must not run; otherwise a caution
	Words   string  `json:"words"`  // of the worst setting, without saying where
	Setting Setting `json:"setting"`
	Count   int     `json:"count"` // settings it concerns
	weight  float64
}

// findings keeps, for each thing found, its worst setting and how often it was found.
type findings struct {
	order []string
	of    map[string]*Finding
}

func (f *findings) add(key string, weight float64, found Finding) {
	old, ok := f.of[key]
	if !ok {
		f.order = append(f.order, key)
		old = &Finding{}
		f.of[key] = old
	}
	found.Count, found.weight = old.Count+1, weight
	if ok && weight <= old.weight {
		old.Count++
		old.Refuse = old.Refuse || found.Refuse
		return
	}
	found.Refuse = found.Refuse || old.Refuse
	*old = found
}

// Judge goes through the settings of a plan for the nominal board. Stress above its
// rating refuses the plan, with the rotor held too; above 70 % it is a caution.
// Every flag is a caution, at its first setting. A motor that starts from rest at none of the settings,
// and a board that oscillates at none, refuse it. The error is of a setting that cannot be.
func (m *Model) Judge(settings []Setting) ([]Finding, error) {
	f := findings{of: map[string]*Finding{}}
	started, oscillating := 0, 0
	for _, s := range settings {
		r, err := m.At(s)
		if err != nil {
			return nil, err
		}
		for _, flag := range r.Flags {
			f.add(flag.Name, 0, Finding{Name: flag.Name, Words: flag.Words, Setting: s})
		}
		if !r.Oscillates {
			continue
		}
		oscillating++
		if err := m.judgeStress(&f, s); err != nil {
			return nil, err
		}
		if m.nominal.load.k > 0 {
			if start, err := m.Start(s); err == nil && start.Starts() {
				started++
			}
		}
	}
	if len(settings) > 0 && oscillating == 0 {
		f.of[NoOscillation].Refuse = true
	}
	if oscillating > 0 && m.nominal.load.k > 0 && started == 0 {
		f.add("never", 0, Finding{Name: NoStart, Refuse: true, Setting: settings[0], Words: "the motor starts from rest at none of the plan's settings"})
	}
	out := make([]Finding, len(f.order))
	for i, key := range f.order {
		out[i] = *f.of[key]
	}
	return out, nil
}

func (m *Model) judgeStress(f *findings, s Setting) error {
	table, err := m.Stress(s)
	if err != nil {
		return err
	}
	for _, t := range []struct {
		rows  []Stress
		words string
	}{{table.Running, ""}, {table.Locked, "with the rotor held, "}} {
		if t.words != "" && m.nominal.load.k == 0 {
			continue
		}
		for _, row := range t.rows {
			if share := row.Share(); share > Caution {
				f.add(t.words+row.Part+row.What, share, Finding{Name: StressFinding, Refuse: share > 1, Setting: s, Words: t.words + row.String()})
			}
		}
	}
	return nil
}
