package index

import (
	"context"
	"database/sql/driver"
	"errors"
	"strings"

	"github.com/mattn/go-sqlite3"
)

// rowsAtOnce is how many rows one statement inserts: the way into the database
// costs more than a row does.
const rowsAtOnce = 16

// inserter inserts rows many at a time, in the order in which they come.
type inserter struct {
	many, one driver.Stmt
	width     int // columns
	values    []driver.NamedValue
}

// newInserter prepares for a table and its columns.
func newInserter(c *sqlite3.SQLiteConn, into string) (*inserter, error) {
	width := strings.Count(into, ",") + 1
	row := "(?" + strings.Repeat(", ?", width-1) + ")"
	i := &inserter{width: width}
	var err error
	if i.one, err = c.Prepare("INSERT INTO " + into + " VALUES " + row); err != nil {
		return nil, err
	}
	if i.many, err = c.Prepare("INSERT INTO " + into + " VALUES " + row + strings.Repeat(", "+row, rowsAtOnce-1)); err != nil {
		i.one.Close()
		return nil, err
	}
	return i, nil
}

// add inserts a row, now or with those that follow.
func (i *inserter) add(row ...driver.Value) error {
	for _, v := range row {
		i.values = append(i.values, driver.NamedValue{Value: v})
	}
	if len(i.values) < rowsAtOnce*i.width {
		return nil
	}
	err := exec(i.many, i.values)
	i.values = i.values[:0]
	return err
}

// flush inserts the rows that are left.
func (i *inserter) flush() error {
	for at := 0; at < len(i.values); at += i.width {
		if err := exec(i.one, i.values[at:at+i.width]); err != nil {
			return err
		}
	}
	i.values = i.values[:0]
	return nil
}

// exec runs a statement, which is a short one: the driver would watch a context
// with a goroutine for each.
func exec(s driver.Stmt, values []driver.NamedValue) error {
	for i := range values {
		values[i].Ordinal = i + 1
	}
	_, err := s.(driver.StmtExecContext).ExecContext(context.Background(), values)
	return err
}

func (i *inserter) close() error { return errors.Join(i.one.Close(), i.many.Close()) }
