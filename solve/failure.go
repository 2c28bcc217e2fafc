package solve

import "fmt"

// A Failure says that no operating point was found, and what is known.
type Failure struct {
	Tried []Attempt
	Worst string  // the balance that is worst: "current balance at tail"; may be ""
	By    float64 // its imbalance in A
	Says  string
}

// leakage in A is the order of a junction's reverse current and below.
const leakage = 1e-15

// Error says it in one sentence.
func (f *Failure) Error() string { return f.Says }

func (l *ladder) failure() *Failure {
	f := &Failure{Tried: l.tried, Worst: l.worst, By: l.worstBy}
	switch {
	case l.broken != "":
		f.Says = fmt.Sprintf("no operating point: the only ones found lie beyond the Early voltage of %s, where the model means nothing; look at what its collector is tied to", l.broken)
	case f.Worst != "" && f.By < leakage:
		f.Says = fmt.Sprintf("no operating point found in %d ways; the worst is the %s, off by %.3g A: it seems to be held by leakage alone, which the models cannot tell; a resistor from there would", len(f.Tried), f.Worst, f.By)
	case f.Worst != "":
		f.Says = fmt.Sprintf("no operating point found in %d ways; the worst is the %s, off by %.3g A", len(f.Tried), f.Worst, f.By)
	default:
		f.Says = fmt.Sprintf("no operating point found in %d ways", len(f.Tried))
	}
	return f
}
