package syntax

import "gainwright/lang/diag"

const (
	studyForm    = "study NAME = EXPR over MODEL samples N seed N at corners"
	scheduleForm = "schedule NAME = EXPR over MODEL.PARAMETER from A to B in N steps"
)

// study reads study NAME = EXPR over …, or study NAME = { name: EXPR, … } over ….
func (p *parser) study() Statement {
	start := p.takeFirst().span.Start
	s := &Study{Name: p.newName("the study's name")}
	p.expect("=", studyForm)
	if p.raw(0).is("{") {
		s.Entries = p.studyEntries()
	} else {
		s.Entries = []StudyEntry{{Expr: p.expression()}}
	}
	s.Over = p.over(studyForm)
	s.Span = p.from(start)
	return s
}

// studyEntries reads { name: EXPR, … }; a line end or ; separates like a comma.
func (p *parser) studyEntries() []StudyEntry {
	var entries []StudyEntry
	seen := map[string]bool{}
	p.enter(modeLines, insideBody)
	for {
		p.skipSeparators()
		if p.raw(0).is("}") {
			break
		}
		if p.raw(0).kind == tokenEnd {
			p.unexpected(p.raw(0))
		}
		name := p.newName("the name of a result")
		p.markFirst()
		if seen[name.Name] {
			p.fail(diag.Syntax, name.Span, "", "the result %s stands twice", name.Name)
		}
		seen[name.Name] = true
		p.expect(":", "study NAME = { name: EXPR, … } over MODEL")
		entries = append(entries, StudyEntry{Name: name, Expr: p.expression()})
		if t := p.raw(0); t.is(",") {
			p.take()
		} else if !t.is(";") && !t.is("}") && t.kind != tokenNewline {
			p.unexpected(t)
		}
	}
	if len(entries) == 0 {
		p.fail(diag.Syntax, p.raw(0).span, "study NAME = { name: EXPR, … } over MODEL", "the study has no result")
	}
	p.leave()
	return entries
}

// over reads the clauses over MODEL, … · samples N · seed N · at corners, in any order.
func (p *parser) over(form string) Over {
	o := Over{Span: p.raw(0).span}
	start := o.Span.Start
	for {
		t := p.raw(0)
		switch {
		case t.word("over"):
			p.once(o.Models != nil, t)
			p.take()
			o.Models = p.names("a model's name")
		case t.word("samples"):
			p.once(o.Samples != nil, t)
			p.take()
			o.Samples = p.sum()
		case t.word("seed"):
			p.once(o.Seed != nil, t)
			p.take()
			o.Seed = p.sum()
		case t.word("at"):
			p.once(o.Corners, t)
			p.take()
			p.expectWord("corners", form)
			o.Corners = true
		default:
			if o.Models == nil {
				p.unexpectedIn(t, "over", form)
			}
			o.Span = p.from(start)
			return o
		}
	}
}

// once refuses a clause that was given before.
func (p *parser) once(given bool, t token) {
	if given {
		p.fail(diag.Syntax, t.span, "", "%s is given twice", t.text)
	}
}

// overSensitivity reads over MODEL, … after sensitivity(EXPR); nil if it does not stand here.
func (p *parser) overSensitivity(x Expr) *Over {
	t := p.raw(0)
	if !t.word("over") {
		return nil
	}
	name := &Name{}
	if c, ok := x.(*Call); ok {
		if n, ok := c.Function.(*Name); ok {
			name = n
		}
	}
	if name.Name != "sensitivity" {
		p.fail(diag.Syntax, t.span, studyForm+"; sensitivity(EXPR) over MODEL", "over belongs to a study, a schedule or sensitivity(…)")
	}
	o := p.over("sensitivity(EXPR) over MODEL")
	if o.Samples != nil || o.Seed != nil || o.Corners {
		p.fail(diag.Syntax, o.Span, "it looks at the nominal values; "+studyForm+" draws samples", "a sensitivity has no samples, seed or corners")
	}
	return &o
}

// schedule reads schedule NAME = EXPR over MODEL.PARAMETER from A to B in N steps.
func (p *parser) schedule() Statement {
	const form = scheduleForm
	start := p.takeFirst().span.Start
	s := &Schedule{Name: p.newName("the schedule's name")}
	p.expect("=", form)
	s.Expr = p.expression()
	p.expectWord("over", form)
	s.Model = p.newName("a model's name")
	p.expect(".", form)
	p.setRole(roleTight)
	s.Parameter = p.newName("the parameter's name")
	p.expectWord("from", form)
	s.From = p.sum()
	p.expectWord("to", form)
	s.To = p.sum()
	p.expectWord("in", form)
	s.Steps = p.sum()
	p.expectWord("steps", form)
	s.Span = p.from(start)
	return s
}

// names reads A, B, …; a line may end after a comma.
func (p *parser) names(what string) []Ident {
	names := []Ident{p.newName(what)}
	for p.raw(0).is(",") {
		p.take()
		p.skipLines()
		names = append(names, p.newName(what))
	}
	return names
}
