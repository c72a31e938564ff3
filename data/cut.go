package data

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"github.com/expr-lang/expr"
	"github.com/expr-lang/expr/ast"
	"github.com/expr-lang/expr/file"
	"github.com/expr-lang/expr/parser"
	"github.com/expr-lang/expr/vm"
)

// cut is a condition on rows, parsed; its columns get their types when the table has been read.
type cut struct {
	text       string
	conditions []string // joined by && on the top level
	columns    []int    // places in the header
}

func newCut(text string, h headings) (*cut, error) {
	c := &cut{text: text}
	if strings.TrimSpace(text) == "" {
		return c, nil
	}
	tree, err := parser.Parse(text)
	if err != nil {
		return nil, cutError(h.file, text, err)
	}
	c.conditions = conjuncts(nil, tree.Node)
	v := &columnVisitor{}
	ast.Walk(&tree.Node, v)
	for _, name := range v.names {
		i := h.index(name)
		if i < 0 {
			return nil, &Error{h.file, h.line, name, message("no such column", "a column of this file in the cut "+quoted(text),
				meant(name, h.names))}
		}
		if !slices.Contains(c.columns, i) {
			c.columns = append(c.columns, i)
		}
	}
	return c, nil
}

// cutError puts the first line of what the expression library says into an Error.
func cutError(name, text string, err error) *Error {
	said := err.Error()
	var e *file.Error
	if errors.As(err, &e) {
		said = e.Message
	}
	said, _, _ = strings.Cut(said, "\n")
	return &Error{File: name, Message: message("the cut "+quoted(text)+" ("+said+")", "a condition on its columns",
		"write it like zHD > 0.01 && IS_CALIBRATOR == 0")}
}

// conjuncts appends the parts of n that are joined by && on its top level.
func conjuncts(parts []string, n ast.Node) []string {
	if b, ok := n.(*ast.BinaryNode); ok && (b.Operator == "&&" || b.Operator == "and") {
		return conjuncts(conjuncts(parts, b.Left), b.Right)
	}
	return append(parts, n.String())
}

// columnVisitor collects the names that an expression uses, as identifiers or as $env["name"].
type columnVisitor struct{ names []string }

// Visit is called for every node.
func (v *columnVisitor) Visit(n *ast.Node) {
	switch n := (*n).(type) {
	case *ast.IdentifierNode:
		if n.Value != "$env" {
			v.names = append(v.names, n.Value)
		}
	case *ast.MemberNode:
		id, isIdentifier := n.Node.(*ast.IdentifierNode)
		name, isText := n.Property.(*ast.StringNode)
		if isIdentifier && isText && id.Value == "$env" {
			v.names = append(v.names, name.Value)
		}
	}
}

// apply evaluates the cut on every row.
func (c *cut) apply(t *table) (Selection, error) {
	s := Selection{File: t.file, Read: len(t.lines)}
	for _, condition := range c.conditions {
		s.Cuts = append(s.Cuts, CutCount{Expression: condition})
	}
	e := newRowEnv(c, t)
	programs, err := c.compile(t.file, e.values)
	if err != nil {
		return s, err
	}
	var machine vm.VM
	for row, line := range t.lines {
		e.set(row)
		failed, err := firstFalse(&machine, programs, e.values)
		if err != nil {
			wrong := cutError(t.file, c.text, err)
			wrong.Line = line
			return s, wrong
		}
		if failed < len(programs) {
			s.Cuts[failed].Removed++
			continue
		}
		s.Kept = append(s.Kept, row)
		s.Lines = append(s.Lines, line)
	}
	if len(s.Kept) == 0 {
		return s, c.nothing(s)
	}
	return s, nil
}

// rowEnv is the values of the cut's columns in one row.
type rowEnv struct {
	values  map[string]any
	names   []string
	columns []func(row int) any
}

func newRowEnv(c *cut, t *table) *rowEnv {
	e := &rowEnv{values: make(map[string]any, len(c.columns))}
	for _, i := range c.columns {
		e.names = append(e.names, t.names[i])
		e.columns = append(e.columns, t.columns[i].typed())
	}
	e.set(0)
	return e
}

func (e *rowEnv) set(row int) {
	for i, name := range e.names {
		e.values[name] = e.columns[i](row)
	}
}

// compile checks the types of every condition and compiles it.
func (c *cut) compile(name string, env map[string]any) ([]*vm.Program, error) {
	programs := make([]*vm.Program, len(c.conditions))
	for i, condition := range c.conditions {
		p, err := expr.Compile(condition, expr.Env(env), expr.AsBool())
		if err != nil {
			return nil, cutError(name, c.text, err)
		}
		programs[i] = p
	}
	return programs, nil
}

// firstFalse is the index of the first condition that a row fails, or their number.
func firstFalse(machine *vm.VM, programs []*vm.Program, env map[string]any) (int, error) {
	for i, p := range programs {
		v, err := machine.Run(p, env)
		if err != nil {
			return i, err
		}
		if keep, _ := v.(bool); !keep {
			return i, nil
		}
	}
	return len(programs), nil
}

// nothing says which condition removed most when no row is left.
func (c *cut) nothing(s Selection) error {
	worst := slices.MaxFunc(s.Cuts, func(a, b CutCount) int { return a.Removed - b.Removed })
	return &Error{File: s.File, Message: message(fmt.Sprintf("no row left of %d by the cut %s", s.Read, quoted(c.text)), "at least one",
		fmt.Sprintf("loosen %s, which removed %d", quoted(worst.Expression), worst.Removed))}
}

// typed gives the cells of a column as numbers if all of them are, as text otherwise. An empty cell among
// numbers is NaN, which no comparison keeps.
func (c *column) typed() func(row int) any {
	numbers := make([]float64, len(c.ends))
	filled := 0
	for row := range numbers {
		cell := c.cell(row)
		if cell == "" {
			numbers[row] = math.NaN()
			continue
		}
		v, ok := parse(cell)
		if !ok {
			return func(row int) any { return c.cell(row) }
		}
		numbers[row] = v
		filled++
	}
	if filled == 0 {
		return func(row int) any { return c.cell(row) }
	}
	return func(row int) any { return numbers[row] }
}
