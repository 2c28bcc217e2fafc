package render

import (
	"fmt"
	"io"
	"math"

	"biaswright/solve"
)

// exceeded finds whose ratings are exceeded, for a mark beside their figures.
func exceeded(cs []solve.Caution) map[string]string {
	over := map[string]string{}
	for i := range cs {
		if cs[i].Kind == "rating" && over[cs[i].Subject] == "" {
			over[cs[i].Subject] = ratingName(cs[i].Rating)
		}
	}
	return over
}

func ratingName(r string) string {
	if r == "" { // a resistor has one rating, its power
		return "rating"
	}
	return r
}

func printCautions(w io.Writer, cs []solve.Caution, l Look) {
	if len(cs) == 0 {
		return
	}
	fmt.Fprintln(w, l.paint("Cautions", bold))
	for i := range cs {
		wrap(w, "  ! ", l.text(CautionText(&cs[i])))
	}
	wrap(w, "    ", "Reminders, not a safety assessment: local codes and licensed practice decide.")
	fmt.Fprintln(w)
}

// CautionText says a caution in a sentence. The limits of voltage and light are
// common practice: 60 V DC is where extra-low voltage without further protection
// ends in dry places, and IEC 62471 is the standard on what light does to eyes.
func CautionText(c *solve.Caution) string {
	switch c.Kind {
	case "high-voltage":
		between := c.Subject
		if c.Other != "" {
			between += " and " + c.Other
		}
		return fmt.Sprintf("%s between %s: above %s DC a touch can injure or kill. Isolate, discharge and measure before you touch; follow your local electrical code, and leave the work to licensed people where it asks for them.",
			Measured(math.Abs(c.Value), "V"), between, stated(c.Limit, "V"))
	case "rating":
		unit := ratingUnit(c.Rating)
		return fmt.Sprintf("%s stands at %s, above its %s of %s (as stated, not derated for temperature).",
			c.Subject, Measured(c.Value, unit), ratingName(c.Rating), stated(c.Limit, unit))
	case "zener-forward":
		return fmt.Sprintf("%s conducts forward, as an ordinary diode, at %s; in its reference role a zener stands reversed.", c.Subject, Measured(c.Value, "A"))
	case "beta-current":
		return fmt.Sprintf("%s carries %s. Above about %s a transistor of its stated kind no longer has a constant beta: expect less gain, and more base current, than this model gives.",
			c.Subject, Measured(c.Value, "A"), stated(c.Limit, "A"))
	case "slip":
		return slipText(c)
	case "hot":
		return fmt.Sprintf("%s dissipates %s, more than %s, and states no rating: it may burn whoever touches it, or itself.", c.Subject, Measured(c.Value, "W"), stated(c.Limit, "W"))
	case "bright":
		return fmt.Sprintf("%s runs at %s: do not look into a bright emitter, infrared least of all, which the eye does not see; IEC 62471 says how its light is judged.",
			c.Subject, Measured(c.Value, "A"))
	case "impossible":
		return fmt.Sprintf("%s carries %s, which nothing survives, and of which no model knows anything: is a resistor missing, or a part the wrong way round?", c.Subject, Measured(c.Value, "A"))
	default:
		return fmt.Sprintf("%s: %s.", c.Subject, c.Kind)
	}
}

func slipText(c *solve.Caution) string {
	unit, whose := slipUnit(c.Rating), "'s "+c.Rating
	if c.Rating == "ohms" || c.Rating == "V" { // the subject's own value
		whose = ""
	}
	side := "more"
	if c.Value < c.Limit {
		side = "less"
	}
	return fmt.Sprintf("%s%s is %s; %s than %s is unusual: is its prefix or its kind a slip?", c.Subject, whose, stated(c.Value, unit), side, stated(c.Limit, unit))
}

// slipUnit gives the unit of a value that looks like a slip, by its name.
func slipUnit(what string) string {
	switch what {
	case "ohms":
		return "Ω"
	case "V", "drop", "Vz", "Vbe", "Veb", "VA":
		return "V"
	default:
		return ""
	}
}

// ratingUnit gives a rating's unit by its symbol.
func ratingUnit(rating string) string {
	switch rating {
	case "Imax":
		return "A"
	case "VCEOmax", "VRmax", "VEBOmax":
		return "V"
	case "Tjmax":
		return "°C"
	default:
		return "W"
	}
}
