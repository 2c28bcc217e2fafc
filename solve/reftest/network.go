package reftest

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"strings"
)

// A Network is a list of elements with their models, as the reference files
// write it. Numbers are SI; node names are free text.
type Network struct {
	ID, Title string
	// Ground is the name of the reference node.
	Ground string
	// Kelvin is the ambient temperature in K.
	Kelvin   float64
	Elements []Element
	Models   map[string]Model
}

// An Element joins nodes. Type is resistor, voltage_source, current_source,
// diode, npn, pnp or ideal_opamp; Pins has a node for each of the type's
// terminals; Value is its ohms, volts or amperes; Area is 1 where none is stated.
type Element struct {
	Name, Type string
	Pins       map[string]string
	Value      float64
	Model      string
	Area       float64
}

// A Model holds a junction's or transistor's parameters. KelvinRef is the
// temperature in K at which they hold. VA 0 stands for infinite. IZ0,
// VZ and NZ are a zener's.
type Model struct {
	Kind                    string
	Isat, N                 float64 // A, 1
	BetaF, BetaR, VA        float64 // 1, 1, V
	IZ0, VZ, NZ             float64 // A, V, 1
	Egap, KelvinRef, RbulkR float64 // eV, K, ohm
}

// thermalVoltage gives kT/q in V at a temperature in K, with the exact SI values
// of k and q (SI Brochure, 9th edition, table 1).
func thermalVoltage(kelvin float64) float64 {
	const k, q = 1.380649e-23, 1.602176634e-19 // J/K, C
	return k / q * kelvin
}

// room is 25 degC in K, where a reference file states no other temperature.
const room = 298.15

// A Case is a network of bias-networks.json with what it must show.
type Case struct {
	Network
	Analysis string // operating_point, temperature_sweep, textbook, …
	Detail   Detail
	Source   string
	Expected []Figure
	Currents []Figure // every terminal current, where the file lists them
}

// A Detail is what an analysis moves: a source (by name) from its nominal value down
// to where a current is a fraction of what it was, or one parameter of a model.
type Detail struct {
	Type, Source     string
	Fraction         float64
	Model, Parameter string
	Values           []float64
}

// A Figure is one expected number. Exactly one of Node, Nodes and Probe says
// what it is of, or none where only Name does.
type Figure struct {
	Name, Tier, Unit string
	Node             string
	Nodes            []string // the voltage of the first against the second
	Probe            *Probe
	At               *struct {
		Celsius float64 `json:"temperature_C"`
	}
	Value     float64
	TolRel    float64  `json:"tol_rel"`
	TolAbs    float64  `json:"tol_abs"`
	Deviation *float64 `json:"full_model_deviation"`
	// ClosedForm is the book's own idealised formula, evaluated to all digits.
	ClosedForm *float64 `json:"closed_form"`
}

// A Probe is a terminal current, into the terminal (Direction "in") or out.
type Probe struct{ Element, Terminal, Direction string }

// Has tells whether the network has an element of that type.
func (n *Network) Has(kind string) bool {
	for _, e := range n.Elements {
		if e.Type == kind {
			return true
		}
	}
	return false
}

// rounding is the least current in A that a resistor between two voltages can
// tell from none: a rounding of the largest supply's on the smallest resistance.
func (n *Network) rounding() float64 {
	volts, ohms := 0.0, math.Inf(1)
	for _, e := range n.Elements {
		switch e.Type {
		case "voltage_source":
			volts = max(volts, math.Abs(e.Value))
		case "resistor":
			ohms = min(ohms, e.Value)
		}
	}
	return 0x1p-52 * volts / ohms
}

// pins names each type's terminals.
var pins = map[string][]string{
	"resistor":       {"a", "b"},
	"voltage_source": {"plus", "minus"},
	"current_source": {"from", "to"},
	"diode":          {"anode", "cathode"},
	"npn":            {"collector", "base", "emitter"},
	"pnp":            {"collector", "base", "emitter"},
	"ideal_opamp":    {"in_plus", "in_minus", "out"},
}

// Cases reads a file of the form of bias-networks.json.
func Cases(path string) ([]Case, error) {
	var file struct {
		Cases []struct {
			ID, Title, Source string
			Kelvin            float64 `json:"temperature_K"`
			Analysis          Detail
			Elements          []json.RawMessage
			Models            map[string]struct {
				Kind      string
				Isat      float64  `json:"I_S"`
				N         *float64 `json:"n"`
				BetaF     float64  `json:"beta_F"`
				BetaR     float64  `json:"beta_R"`
				VA        float64  `json:"V_A"`
				IZ0       float64  `json:"I_Z0"`
				VZ        float64  `json:"V_Z"`
				NZ        float64  `json:"n_Z"`
				Egap      float64  `json:"E_g"`
				KelvinRef *float64 `json:"T_ref_K"`
			}
			Expected []Figure
			Currents []struct {
				Probe
				Value float64
			} `json:"all_currents"`
		}
	}
	if err := readJSON(path, &file); err != nil {
		return nil, err
	}
	var out []Case
	for _, c := range file.Cases {
		n := Network{ID: c.ID, Title: c.Title, Ground: "gnd", Kelvin: c.Kelvin, Models: map[string]Model{}}
		for name, m := range c.Models {
			n.Models[name] = Model{
				Kind: m.Kind, Isat: m.Isat, N: or(m.N, 1), BetaF: m.BetaF, BetaR: m.BetaR, VA: m.VA,
				IZ0: m.IZ0, VZ: m.VZ, NZ: m.NZ, Egap: m.Egap, KelvinRef: or(m.KelvinRef, room),
			}
		}
		for _, raw := range c.Elements {
			e, err := element(raw)
			if err != nil {
				return nil, fmt.Errorf("%s: %s: %w", path, c.ID, err)
			}
			n.Elements = append(n.Elements, e)
		}
		out = append(out, Case{Network: n, Analysis: c.Analysis.Type, Detail: c.Analysis, Source: c.Source, Expected: c.Expected})
		for _, i := range c.Currents {
			probe := i.Probe
			out[len(out)-1].Currents = append(out[len(out)-1].Currents, Figure{
				Name: probe.Element + " " + probe.Terminal, Unit: "A", Probe: &probe, Value: i.Value,
				TolRel: 1e-9, // as the file's own tolerance on currents
				TolAbs: n.rounding(),
			})
		}
	}
	return out, nil
}

// A Known is a circuit of operating-points.json: a network and all its points.
type Known struct {
	Network
	Points []KnownPoint
	// Folds are volts of the source FoldOf at which a branch turns back.
	FoldOf string
	Folds  []float64
}

// A KnownPoint is one operating point: volts by node name, and the determinant's
// sign, -1 where the point cannot be stable.
type KnownPoint struct {
	Volts map[string]float64 `json:"node_volts"`
	Sign  int                `json:"determinant_sign"`
}

// Points reads a file of the form of operating-points.json. The V_T that each
// circuit states is reached by n at 25 degC, where all its values hold.
func Points(path string) ([]Known, error) {
	var file struct {
		Circuits []struct {
			ID, Title, Ground string
			VT                float64 `json:"V_T"`
			Elements          []json.RawMessage
			Points            []KnownPoint `json:"operating_points"`
			Folds             struct {
				Parameter string
				Points    []struct {
					Volts float64 `json:",string"`
				}
			}
		}
	}
	if err := readJSON(path, &file); err != nil {
		return nil, err
	}
	var out []Known
	for _, c := range file.Circuits {
		n := Network{ID: c.ID, Title: c.Title, Ground: c.Ground, Kelvin: room, Models: map[string]Model{}}
		named := map[Model]string{}
		for _, raw := range c.Elements {
			e, err := element(raw)
			if err != nil {
				return nil, fmt.Errorf("%s: %s: %w", path, c.ID, err)
			}
			if m, ok := inlineModel(raw, e.Type, c.VT); ok {
				if named[m] == "" {
					named[m] = fmt.Sprintf("%s_%d", m.Kind, len(named)+1)
					n.Models[named[m]] = m
				}
				e.Model = named[m]
			}
			n.Elements = append(n.Elements, e)
		}
		k := Known{Network: n, Points: c.Points, FoldOf: strings.TrimPrefix(c.Folds.Parameter, "value in volts of source ")}
		for _, p := range c.Folds.Points {
			k.Folds = append(k.Folds, p.Volts)
		}
		out = append(out, k)
	}
	return out, nil
}

// inlineModel reads a model that is written on its element.
func inlineModel(raw json.RawMessage, kind string, vt float64) (Model, bool) {
	if kind != "diode" && kind != "npn" && kind != "pnp" {
		return Model{}, false
	}
	var m struct {
		Isat  float64  `json:"I_S"`
		N     *float64 `json:"n"`
		BetaF float64  `json:"beta_F"`
		BetaR float64  `json:"beta_R"`
		VA    float64  `json:"V_A"`
	}
	if json.Unmarshal(raw, &m) != nil {
		return Model{}, false
	}
	return Model{
		Kind: kind, Isat: m.Isat, N: or(m.N, 1) * vt / thermalVoltage(room),
		BetaF: m.BetaF, BetaR: m.BetaR, VA: m.VA, KelvinRef: room,
	}, true
}

// element reads one element of either file.
func element(raw json.RawMessage) (Element, error) {
	var e struct {
		Ref, Name, Type, Polarity, Model string
		Ohms, Volts, Amps, Area          *float64
	}
	var words map[string]any
	if err := json.Unmarshal(raw, &e); err != nil {
		return Element{}, err
	}
	if err := json.Unmarshal(raw, &words); err != nil {
		return Element{}, err
	}
	switch e.Type {
	case "transistor":
		e.Type = e.Polarity
	case "dc voltage source":
		e.Type = "voltage_source"
	}
	out := Element{Name: e.Ref + e.Name, Type: e.Type, Model: e.Model, Area: or(e.Area, 1), Pins: map[string]string{}}
	out.Value = or(e.Ohms, or(e.Volts, or(e.Amps, 0)))
	for _, pin := range pins[e.Type] {
		node, ok := words[pin].(string)
		if !ok {
			return Element{}, fmt.Errorf("%s has no %s", out.Name, pin)
		}
		out.Pins[pin] = node
	}
	if len(out.Pins) == 0 {
		return Element{}, fmt.Errorf("%s is of unknown type %q", out.Name, e.Type)
	}
	return out, nil
}

func or(p *float64, otherwise float64) float64 {
	if p == nil {
		return otherwise
	}
	return *p
}

func readJSON(path string, into any) error {
	data, err := os.ReadFile(path)
	if err != nil {
		return err
	}
	if err := json.Unmarshal(data, into); err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	return nil
}
