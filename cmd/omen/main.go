package main

import (
	_ "github.com/expr-lang/expr"
	_ "github.com/gocarina/gocsv"
	_ "github.com/google/go-cmp/cmp"
	_ "github.com/pelletier/go-toml/v2"
	_ "github.com/pelletier/go-toml/v2/unstable"
	_ "github.com/sbinet/npyio"
	_ "github.com/sbinet/npyio/npy"
	_ "github.com/sbinet/npyio/npz"
	_ "github.com/schollz/progressbar/v3"
	_ "github.com/spf13/pflag"
	_ "golang.org/x/sys/unix"
	_ "golang.org/x/term"
	_ "gonum.org/v1/gonum/diff/fd"
	_ "gonum.org/v1/gonum/integrate/quad"
	_ "gonum.org/v1/gonum/mat"
	_ "gonum.org/v1/gonum/mathext"
	_ "gonum.org/v1/gonum/optimize"
	_ "gonum.org/v1/gonum/stat"
	_ "gonum.org/v1/gonum/stat/distuv"
	_ "gonum.org/v1/plot"
	_ "gonum.org/v1/plot/cmpimg"
	_ "gonum.org/v1/plot/font/liberation"
	_ "gonum.org/v1/plot/plotter"
	_ "gonum.org/v1/plot/vg/draw"
	_ "gonum.org/v1/plot/vg/vgimg"
	_ "gonum.org/v1/plot/vg/vgpdf"
	_ "gonum.org/v1/plot/vg/vgsvg"
	_ "pgregory.net/rapid"
)

func main() {}
