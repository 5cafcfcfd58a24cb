package assemble

import (
	"context"
	"encoding"
	"encoding/json"
	"fmt"
	"slices"
	"strings"

	"steelyard/engine"
	"steelyard/engine/weighing"
	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/reconcile"
	"steelyard/probes/reported"
	"steelyard/recipes"
)

// block plans one probe's block: a node for every table, every reduction that
// some estimate uses, and every estimate.
func (p *Plan) block(b recipes.Block) error {
	pr := probe(b.Probe)
	full := b.Probe + "." + b.Name
	tables := map[string]string{} // data block to the node of its table
	p.tables(full, "", b.Data, pr.Blocks, tables)
	reductions := map[string]bool{}
	for _, e := range b.Estimates {
		m := findMethod(pr, e.Method)
		var inputs []string
		for _, name := range m.Uses {
			r := findReduction(pr, name)
			if !present(r, b.Data) {
				continue
			}
			id := full + "." + name + ".reduced"
			if !reductions[id] {
				p.Nodes = append(p.Nodes, p.reductionNode(id, full, r, pr, b, tables))
				reductions[id] = true
			}
			inputs = append(inputs, id)
		}
		p.Nodes = append(p.Nodes, p.estimateNode(full, m, pr, b, e, inputs))
		name := full + "." + e.Name
		p.estimates = append(p.estimates, planned{name: name, block: full, probe: b.Probe, method: e.Method, masses: name + ".masses"})
	}
	return nil
}

func findMethod(p estimate.Probe, name string) estimate.Method {
	i := slices.IndexFunc(p.Methods, func(m estimate.Method) bool { return m.Name == name })
	if i < 0 {
		panic("assemble: a recipe names the method " + name + ", which is not declared")
	}
	return p.Methods[i]
}

func findReduction(p estimate.Probe, name string) estimate.Reduction {
	i := slices.IndexFunc(p.Reductions, func(r estimate.Reduction) bool { return r.Name == name })
	if i < 0 {
		panic("assemble: a method uses the reduction " + name + ", which is not declared")
	}
	return p.Reductions[i]
}

// tables plans the tables of data blocks and of the blocks nested in them.
func (p *Plan) tables(full, prefix string, data []recipes.Data, declared []method.Block, ids map[string]string) {
	for _, d := range data {
		b, name := findBlock(declared, d.Kind), prefix+d.Kind
		if d.Path != "" {
			ids[name] = full + "." + name + ".table"
			p.Nodes = append(p.Nodes, p.tableNode(ids[name], d, b))
		}
		p.tables(full, name+".", d.Nested, b.Blocks, ids)
	}
}

// blockNames lists the data blocks of a probe's block, nested ones behind a dot.
func blockNames(prefix string, data []recipes.Data) []string {
	var names []string
	for _, d := range data {
		names = append(names, prefix+d.Kind)
		names = append(names, blockNames(prefix+d.Kind+".", d.Nested)...)
	}
	return names
}

// present reports whether the recipe has the data that a reduction cannot do
// without, and some of the data it can use.
func present(r estimate.Reduction, data []recipes.Data) bool {
	have, some := blockNames("", data), false
	for _, from := range r.From {
		name, optional := strings.CutSuffix(from, "?")
		if !slices.Contains(have, name) && !optional {
			return false
		}
		some = some || slices.Contains(have, name)
	}
	return some
}

// sources lists those of a reduction's data blocks that the recipe has.
func sources(r estimate.Reduction, data []recipes.Data) []string {
	have := blockNames("", data)
	var names []string
	for _, from := range r.From {
		if name := strings.TrimSuffix(from, "?"); slices.Contains(have, name) {
			names = append(names, name)
		}
	}
	return names
}

// restrict leaves a task the named data blocks only, and returns the facts they
// put into a node's key.
func restrict(t *estimate.Task, names []string) []string {
	kept := map[string]method.Settings{}
	var facts []string
	for _, name := range names {
		kept[name] = t.Blocks[name]
		facts = append(facts, settingsFacts(name, t.Blocks[name])...)
	}
	t.Blocks = kept
	return facts
}

func (p *Plan) reductionNode(id, full string, r estimate.Reduction, pr estimate.Probe, b recipes.Block, tables map[string]string) engine.Node {
	t := p.task(full, b.Data, pr.Blocks, nil)
	from := sources(r, b.Data)
	n := engine.Node{ID: id, Kind: pr.Name + "/" + r.Name, Version: r.Version, Where: place(b.Range)}
	n.Params = append(p.backgroundFacts(), restrict(t, from)...)
	if r.Random {
		n.Params = append(n.Params, p.samplingFacts()...)
	}
	for _, name := range from {
		if table := tables[name]; table != "" {
			n.Inputs = append(n.Inputs, table)
		}
	}
	n.Run = func(ctx context.Context, job engine.Job) (engine.Output, error) {
		t := *t
		t.Tables = map[string]*catalogue.Table{}
		for _, name := range from {
			if tables[name] == "" {
				continue
			}
			t.Tables[name] = new(catalogue.Table)
			if err := decode(job, tables[name], t.Tables[name]); err != nil {
				return engine.Output{}, err
			}
		}
		t.Sampling = p.sampling(&n, job)
		out, err := r.Run(ctx, &t)
		if err != nil {
			return engine.Output{}, err
		}
		return encode(out)
	}
	return n
}

func (p *Plan) estimateNode(full string, m estimate.Method, pr estimate.Probe, b recipes.Block, e recipes.Estimate, inputs []string) engine.Node {
	name := full + "." + e.Name
	t := p.task(name, b.Data, pr.Blocks, p.lengths(e.Settings, m.Settings))
	n := engine.Node{ID: name, Kind: pr.Name + "/" + m.Name, Version: m.Version, Inputs: inputs, Where: place(e.Range)}
	n.Params = append(p.backgroundFacts(), p.samplingFacts()...)
	n.Params = append(n.Params, restrict(t, blocksOf(m, pr, b.Data))...)
	n.Params = append(n.Params, settingsFacts("estimate", t.Settings)...)
	n.Run = func(ctx context.Context, job engine.Job) (engine.Output, error) {
		t := *t
		t.Reduced = map[string][]byte{}
		for _, id := range inputs {
			reduced, err := job.Input(id)
			if err != nil {
				return engine.Output{}, err
			}
			// Of a reduction that was made otherwise, how stands behind its name.
			name, _, _ := strings.Cut(strings.TrimPrefix(id, full+"."), ".reduced")
			t.Reduced[name] = reduced
		}
		t.Sampling = p.sampling(&n, job)
		draws, err := m.Run(ctx, &t)
		if err != nil {
			return engine.Output{}, err
		}
		return encodeDraws(draws)
	}
	return n
}

// blocksOf lists the data blocks a method may look at: those of its reductions
// and those its declaration asks for.
func blocksOf(m estimate.Method, pr estimate.Probe, data []recipes.Data) []string {
	var names []string
	add := func(name string) {
		if !slices.Contains(names, name) {
			names = append(names, name)
		}
	}
	for _, use := range m.Uses {
		for _, name := range sources(findReduction(pr, use), data) {
			add(name)
		}
	}
	have := blockNames("", data)
	for _, set := range m.Data {
		for _, name := range set {
			if slices.Contains(have, name) {
				add(name)
			}
		}
	}
	return names
}

// reported plans a published mass.
func (p *Plan) reported(m recipes.Reported) error {
	n, err := p.reportedNode(m)
	if err != nil {
		return err
	}
	p.Nodes = append(p.Nodes, n)
	p.estimates = append(p.estimates, planned{name: n.ID, block: n.ID, probe: m.Probe, method: "reported", masses: n.ID + ".masses"})
	return nil
}

func (p *Plan) reportedNode(m recipes.Reported) (engine.Node, error) {
	name := "reported." + m.Name
	stated := p.background
	if m.Cosmology != nil {
		var err error
		if stated, err = universe(*m.Cosmology); err != nil {
			return engine.Node{}, err
		}
	}
	// A radius quoted as an angle stays one: it is a length in the cosmology it was
	// quoted in, not in the recipe's.
	t := &estimate.Task{Name: name, Object: p.object, Cosmology: p.background, Settings: m.Settings}
	n := engine.Node{ID: name, Kind: "reported", Version: reported.Version, Where: place(m.Range)}
	n.Params = append(p.backgroundFacts(), p.samplingFacts()...)
	n.Params = append(n.Params, settingsFacts("reported", t.Settings)...)
	n.Params = append(n.Params, "stated_"+cosmologyFact(stated))
	n.Run = func(ctx context.Context, job engine.Job) (engine.Output, error) {
		t := *t
		t.Sampling = p.sampling(&n, job)
		draws, err := reported.Estimate(ctx, &t, stated)
		if err != nil {
			return engine.Output{}, err
		}
		return encodeDraws(draws)
	}
	return n, nil
}

// massesVersion is raised when the same draws would be summarised otherwise.
const massesVersion = 2

// massesNode summarises an estimate's draws: everything printed of it but the
// masses at the places of comparison.
func (p *Plan) massesNode(e planned) engine.Node {
	definitions := p.definitions()
	n := engine.Node{ID: e.masses, Kind: "masses", Version: massesVersion, Inputs: []string{e.name}}
	n.Params = append(p.backgroundFacts(), fmt.Sprintf("estimate = %q %q %q", e.name, e.probe, e.method))
	for _, d := range definitions {
		n.Params = append(n.Params, fmt.Sprintf("own = %s %q", exact(d.Delta), d.Of))
	}
	n.Run = func(_ context.Context, job engine.Job) (engine.Output, error) {
		var draws infer.Draws
		if err := decode(job, e.name, &draws); err != nil {
			return engine.Output{}, err
		}
		s, err := summary(e, &draws, definitions, reconcile.Background{Cosmology: p.background, Redshift: p.object.Redshift})
		if err != nil {
			return engine.Output{}, err
		}
		b, err := json.Marshal(s)
		return engine.Output{Bytes: b}, err
	}
	return n
}

// definitions lists the overdensities at which every estimate's own mass is
// printed: the usual three and whichever others the comparison asks for.
func (p *Plan) definitions() []halo.Definition {
	list := []halo.Definition{{Delta: 2500, Of: "critical"}, {Delta: 500, Of: "critical"}, {Delta: 200, Of: "critical"}}
	if p.Recipe.Reconcile == nil {
		return list
	}
	for _, at := range p.Recipe.Reconcile.At {
		if d := (halo.Definition{Delta: at.Delta, Of: at.Of}); at.Of != "" && !slices.Contains(list, d) {
			list = append(list, d)
		}
	}
	return list
}

func summary(e planned, d *infer.Draws, definitions []halo.Definition, b reconcile.Background) (*weighing.Estimate, error) {
	s := &weighing.Estimate{
		Name: e.name, Probe: e.probe, Method: e.method, Draws: d.N, Covers: d.Covers,
		Parameters: map[string]weighing.Interval{}, Checks: []weighing.Check{},
		Assumes: append([]string{}, d.Assumes...), Warnings: append([]string{}, d.Warnings...),
		Quality: weighing.Quality{
			Converged: d.Quality.Converged, Sampler: d.Quality.Sampler, EffectiveDraws: d.Quality.EffectiveDraws,
			TailShape: d.Quality.TailShape, Chi2: d.Quality.Chi2, Dof: d.Quality.Dof,
		},
	}
	for _, q := range d.Parameters {
		v := infer.Percentiles(q.Values, 16, 50, 84)
		s.Parameters[q.Name] = weighing.Interval{Lo: v[0], Median: v[1], Hi: v[2]}
	}
	own, err := reconcile.OwnMasses(d, definitions, b)
	if err != nil {
		return nil, err
	}
	if s.Own, err = ownMasses(own, b); err != nil {
		return nil, err
	}
	for _, c := range d.Checks {
		check := weighing.Check{Name: c.Name, Statistic: c.Statistic, Passed: c.Passed, Note: c.Note}
		if c.PValue >= 0 {
			check.PValue = &c.PValue
		}
		s.Checks = append(s.Checks, check)
	}
	return s, nil
}

func encode(v encoding.BinaryMarshaler) (engine.Output, error) {
	b, err := v.MarshalBinary()
	return engine.Output{Bytes: b}, err
}

func decode(job engine.Job, id string, into encoding.BinaryUnmarshaler) error {
	b, err := job.Input(id)
	if err != nil {
		return err
	}
	if err := into.UnmarshalBinary(b); err != nil {
		return fmt.Errorf("the output of %s cannot be read: %w", id, err)
	}
	return nil
}
