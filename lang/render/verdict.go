package render

import (
	"gainwright/lang/eval"
	"gainwright/lang/value"
)

// Verdict is the outcome of a requirement or a claim in words.
type Verdict struct {
	Word  string   // "met", "missed", "not judged", "agrees", "disagrees", "undecided"
	Text  string   // what was required or claimed
	Below []string // how it came out
	Poles string   // of a claimed gain: the poles that the printed numbers give
	Notes []string
}

// Fails tells whether the verdict makes a run end with exit status 1.
func (v Verdict) Fails() bool {
	return v.Word == "missed" || v.Word == "disagrees" || v.Word == "undecided"
}

// VerdictOf puts a requirement or a claim into words; another event gives an empty one.
func VerdictOf(e eval.Event, o Options) Verdict {
	switch {
	case e.Requirement != nil:
		return requirementVerdict(e, e.Requirement, o)
	case e.Claim != nil:
		return claimVerdict(e, e.Claim, o)
	}
	return Verdict{}
}

func requirementVerdict(e eval.Event, r *eval.Requirement, o Options) Verdict {
	v := Verdict{Word: "met", Text: firstOf(r.Why, e.Text)}
	switch {
	case r.NotJudged:
		v.Word = "not judged"
	case !r.Met:
		v.Word = "missed"
	}
	sides := ""
	if r.Op != "" && r.Left != nil && r.Right != nil {
		sides = sidesText(r, o)
	}
	switch {
	case sides != "" && e.Text == Inline(r.Left, o)+" "+r.Op+" "+Inline(r.Right, o):
		// Two numbers compared say it all themselves.
		if r.Why != "" {
			v.Below = append(v.Below, e.Text)
		}
	case r.Why != "" && sides != "":
		v.Below = append(v.Below, e.Text+": "+sides)
	case r.Why != "":
		v.Below = append(v.Below, e.Text)
	case sides != "" && sides != e.Text:
		v.Below = append(v.Below, sides)
	}
	if r.WithinRounding {
		v.Below = append(v.Below, "within rounding: the bound lies inside the value's own uncertainty")
	}
	if r.Because != "" {
		v.Below = append(v.Below, r.Because)
	}
	return v
}

// sidesText shows both sides of a comparison with so many digits that they differ.
func sidesText(r *eval.Requirement, o Options) string {
	left, right := Inline(r.Left, o), Inline(r.Right, o)
	for d := o.digits() + 1; unpadded(left) == unpadded(right) && !r.Met && d <= 17; d++ {
		o.Digits = d
		left, right = Inline(r.Left, o), Inline(r.Right, o)
	}
	if r.Met || r.NotJudged {
		return left + " " + r.Op + " " + right
	}
	return left + " is not " + r.Op + " " + right
}

func claimVerdict(e eval.Event, c *eval.Claim, o Options) Verdict {
	v := Verdict{Word: "agrees", Text: e.Text, Notes: c.Notes}
	switch {
	case c.Undecided && !c.Agrees && !hasDisagreement(c):
		v.Word = "undecided"
	case !c.Agrees:
		v.Word = "disagrees"
	}
	for _, entry := range c.Entries {
		v.Below = append(v.Below, claimEntry(entry))
	}
	if len(c.Poles) > 0 {
		v.Poles, _ = listText(&value.List{Items: c.Poles}, o)
	}
	return v
}
