package main

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"os"
	"strings"

	"bytes"

	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
	"omen/data"
	"omen/likelihood"
	"omen/model"
)

// sampleColumns are the columns that a published sample can have.
var sampleColumns = []data.Column{
	{Name: "Om", What: "the density parameter of matter", NotNegative: true},
	{Name: "OL", What: "the density parameter of dark energy", Optional: true},
	{Name: "Ok", What: "that of curvature", Optional: true},
	{Name: "Or", What: "that of radiation", Optional: true, NotNegative: true},
	{Name: "H0", What: "the Hubble constant in km/s/Mpc", Optional: true, NotNegative: true},
	{Name: "w0", What: "the equation of state today", Optional: true},
	{Name: "wa", What: "its change", Optional: true},
	{Name: "weight", What: "the weight of the row", Optional: true, NotNegative: true},
}

// runSamples writes constraints and fates of a posterior sample that was published.
func (o *fateOptions) runSamples(knowsH0 bool, stdout io.Writer) error {
	text, err := os.ReadFile(o.samples)
	if err != nil {
		return usagef("--samples: cannot read %s: %v", o.samples, err.(*os.PathError).Err)
	}
	columns, err := o.columnMap()
	if err != nil {
		return err
	}
	plain, err := data.Decompress(bytes.NewReader(text))
	if err != nil {
		return usagef("--samples: cannot read %s: %v", o.samples, err)
	}
	values, _, err := data.ReadColumns(plain, o.samples, data.Options{Columns: columns}, sampleColumns...)
	if err != nil {
		return err
	}
	sum := sha256.Sum256(text)
	s := result.Sample{Title: "Posterior sample " + o.samples, Version: version(), Weights: values["weight"],
		KnowsH0: knowsH0 || values["H0"] != nil, Inputs: []result.InputFile{{Path: o.samples, SHA256: hex.EncodeToString(sum[:])}}}
	if err := o.universes(&s, values); err != nil {
		return err
	}
	summary := result.OfSample(s)
	if o.asJSON {
		return report.JSON(stdout, summary)
	}
	return report.Text(stdout, summary)
}

// columnMap reads --columns Om=omegam,OL=omegal.
func (o *fateOptions) columnMap() (map[string]string, error) {
	m := map[string]string{}
	for _, pair := range o.columns {
		name, column, ok := strings.Cut(pair, "=")
		if !ok || name == "" || column == "" {
			return nil, usagef("--columns: found %q, expected name=column pairs such as Om=omega_m,OL=omega_l", pair)
		}
		m[name] = column
	}
	return m, nil
}

// universes makes one of every row. Columns that the sample does not have are the flags'.
func (o *fateOptions) universes(s *result.Sample, values map[string][]float64) error {
	om := values["Om"]
	at := func(name string, i int, otherwise float64) float64 {
		if v := values[name]; v != nil {
			return v[i]
		}
		return otherwise
	}
	total := 0.0
	for i := range om {
		total += at("weight", i, 1)
		u := model.Universe{Om: om[i], H0: at("H0", i, o.u.H0), W0: at("w0", i, o.u.W0), Wa: at("wa", i, o.u.Wa)}
		if u.Or = at("Or", i, o.u.Or); o.radiation == fromTemperature && values["Or"] == nil {
			u.Or = model.RadiationFromTemperature(u.H0)
		}
		u.OL = at("OL", i, 1-u.Om-u.Or-at("Ok", i, 0))
		s.Universes = append(s.Universes, u)
	}
	if !(total > 0) {
		return usagef("--samples: all weights in %s are 0; is the column the right one?", o.samples)
	}
	for _, name := range likelihood.Names() {
		if name == "OL" && values["Ok"] != nil || values[name] != nil && name != "M" {
			s.Names = append(s.Names, name)
		}
	}
	s.Notes = append(s.Notes, fmt.Sprintf("radiation: %s", radiationOf(values, o.radiation)))
	return nil
}

func radiationOf(values map[string][]float64, flag string) string {
	switch {
	case values["Or"] != nil:
		return "column Or"
	case flag == fromTemperature:
		return "from the CMB temperature"
	case flag == "0":
		return "none"
	}
	return "Or = " + flag
}
