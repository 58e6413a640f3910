package syntax

// role is a token's part in the text, as far as the tidy printer must know it.
type role uint8

const (
	rolePlain   role = iota
	roleSign         // a minus that belongs to what follows
	roleTight        // no blank on either side
	roleChosen       // blanks on both sides or on none, as the author chose
	roleSpaced       // a blank on both sides
	rolePostfix      // no blank before
	rolePercent      // a blank before only as the author chose
	roleBody         // the brace that opens a model, a diagram or a study
	roleSignals      // the word input, state or output at the start of its line
)

func operatorRole(op string) role {
	switch op {
	case "^":
		return roleTight
	case "*", "/":
		return roleChosen
	}
	return roleSpaced
}
