package syntax

import (
	"fmt"
	"strings"
)

// dump writes an expression with every grouping in the open, for comparison in tests.
func dump(x Expr) string {
	switch e := x.(type) {
	case nil:
		return "-"
	case *Number:
		s := e.Text
		if e.Imaginary {
			s += "i"
		}
		if e.Percent {
			s += "%"
		}
		if e.Unit != nil {
			s += "<" + dumpUnit(e.Unit) + ">"
		}
		return s
	case *Text:
		return fmt.Sprintf("%q", e.Value)
	case *Boolean:
		return fmt.Sprint(e.Value)
	case *Name:
		return e.Name
	case *Unary:
		return "(" + e.Op + " " + dump(e.X) + ")"
	case *Binary:
		return "(" + dump(e.L) + " " + e.Op + " " + dump(e.R) + ")"
	case *Call:
		var args []string
		for _, a := range e.Args {
			s := dump(a.Value)
			if a.Name != nil {
				s = a.Name.Name + ": " + s
			}
			args = append(args, s)
		}
		return dump(e.Function) + "(" + strings.Join(args, ", ") + ")"
	case *Index:
		var subscripts []string
		for _, s := range e.Subscripts {
			text := dump(s.Low)
			if s.High != nil {
				text += ".." + dump(s.High)
			}
			subscripts = append(subscripts, text)
		}
		return dump(e.X) + "[" + strings.Join(subscripts, ", ") + "]"
	case *Field:
		return dump(e.X) + "." + e.Name.Name
	case *List:
		return "[" + strings.Join(dumpAll(e.Elements), ", ") + "]"
	case *ForEach:
		return "[" + dump(e.Body) + " for " + e.Variable.Name + " of " + dump(e.In) + " where " + dump(e.Where) + "]"
	case *If:
		return "{" + dump(e.Cond) + " ? " + dump(e.Then) + " : " + dump(e.Else) + "}"
	}
	return fmt.Sprintf("%T", x)
}

func dumpAll(xs []Expr) []string {
	var out []string
	for _, x := range xs {
		out = append(out, dump(x))
	}
	return out
}

func dumpUnit(u *Unit) string {
	var parts []string
	for _, f := range u.Factors {
		s := f.Symbol
		if f.Exponent != 1 {
			s = fmt.Sprintf("%s^%d", s, f.Exponent)
		}
		parts = append(parts, s)
	}
	return strings.Join(parts, " ")
}

func dumpNames(names []Ident) string {
	var out []string
	for _, n := range names {
		out = append(out, n.Name)
	}
	return strings.Join(out, " ")
}

func dumpOver(o *Over) string {
	if o == nil {
		return ""
	}
	s := " over " + dumpNames(o.Models)
	if o.Samples != nil {
		s += " samples " + dump(o.Samples)
	}
	if o.Seed != nil {
		s += " seed " + dump(o.Seed)
	}
	if o.Corners {
		s += " corners"
	}
	return s
}

func dumpIn(u *Unit) string {
	if u == nil {
		return ""
	}
	return " in <" + dumpUnit(u) + ">"
}

// dumpStatement writes a statement in the same way.
func dumpStatement(s Statement) string {
	switch s := s.(type) {
	case *Binding:
		return "bind " + s.Name.Name + " = " + dump(s.Expr) + dumpOver(s.Over)
	case *Show:
		return "show " + dump(s.Expr) + dumpIn(s.In) + dumpOver(s.Over)
	case *Require:
		return fmt.Sprintf("require %s %q", dump(s.Cond), s.Why)
	case *Claim:
		return "claim " + dump(s.Expr) + " is " + dump(s.Printed) + dumpIn(s.In)
	case *Define:
		return fmt.Sprintf("define %s(%s) = %s %q", s.Name.Name, dumpNames(s.Params), dump(s.Body), s.Doc)
	case *Use:
		return fmt.Sprintf("use %q", s.Path)
	case *Model:
		return "model " + s.Name.Name + dumpItems(s.Items)
	case *Diagram:
		return "diagram " + s.Name.Name + dumpItems(s.Items)
	case *Study:
		out := "study " + s.Name.Name
		for _, e := range s.Entries {
			out += " {" + e.Name.Name + ": " + dump(e.Expr) + "}"
		}
		return out + dumpOver(&s.Over)
	case *Schedule:
		return fmt.Sprintf("schedule %s = %s over %s.%s from %s to %s in %s", s.Name.Name, dump(s.Expr),
			s.Model.Name, s.Parameter.Name, dump(s.From), dump(s.To), dump(s.Steps))
	}
	return fmt.Sprintf("%T", s)
}

func dumpItems(items []Item) string {
	var out strings.Builder
	for _, i := range items {
		out.WriteString("; " + dumpItem(i))
	}
	return out.String()
}

func dumpItem(i Item) string {
	switch i := i.(type) {
	case *Given:
		return "given " + i.Name.Name + " = " + dump(i.Value) + " ± " + dump(i.Tolerance)
	case *Signals:
		out := i.Role
		for _, s := range i.Entries {
			out += " " + s.Name.Name + dumpIn(s.Unit)
			if s.Range != nil {
				out += " range " + dump(s.Range)
			}
			if s.Expr != nil {
				out += " = " + dump(s.Expr)
			}
			out += ","
		}
		return out
	case *Let:
		return "let " + i.Name.Name + " = " + dump(i.Expr)
	case *Rate:
		return fmt.Sprintf("rate %s = %s (next %v)", i.Name.Name, dump(i.Expr), i.Next)
	case *Every:
		return "every " + dump(i.Period)
	case *Around:
		out := fmt.Sprintf("around (rest %v)", i.Rest)
		for _, v := range i.Values {
			out += " " + v.Name.Name + " = " + dump(v.Value)
		}
		return out + " find " + dumpNames(i.Find)
	}
	return fmt.Sprintf("%T", i)
}

// dumpFile writes a file's statements, one a line.
func dumpFile(f *File) string {
	var out strings.Builder
	for _, s := range f.Statements {
		out.WriteString(dumpStatement(s) + "\n")
	}
	return out.String()
}
