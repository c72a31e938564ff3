package data

import "strings"

// spellings are the column names of public releases and their relatives for each of our names, best first
// (common practice). Those of supernovae are in the tables of Scolnic et al. 2018 (ApJ 859:101) and 2022
// (ApJ 938:113), others are from memory.
var spellings = []struct {
	ours string
	seen []string
}{
	{"z", []string{"zHD", "z_HD", "zcmb", "z_cmb", "z_eff", "zeff", "redshift"}},
	{"z_hel", []string{"zhel", "z_helio", "zhelio", "z_heliocentric"}},
	{"mag", []string{"m_b_corr", "mb", "m_b", "magnitude"}},
	{"mag_err", []string{"m_b_corr_err", "m_b_corr_err_DIAG", "dmb", "mb_err", "m_b_err", "mag_error", "dmag"}},
	{"mu", []string{"MU", "distmod", "distance_modulus", "MUMODEL_CORR"}},
	{"mu_err", []string{"MUERR", "MU_ERR", "dmu", "mu_error", "sigma_mu", "MUERR_FINAL"}},
	{"name", []string{"CID", "SNID", "SN", "object", "id"}},
	{"survey", []string{"IDSURVEY", "sample", "set"}},
	{"quantity", []string{"observable", "type"}},
	{"value", []string{"mean"}},
	{"age", []string{"age_gyr", "t"}},
	{"bound", []string{"limit"}},
	{"H", []string{"Hz", "H(z)", "H_z"}},
	{"error", []string{"err", "sigma", "sig", "std", "uncertainty"}},
}

// Recognise proposes which of a file's columns carries which of our quantities, by common spellings whatever
// their case. It is for a person to confirm: the readers never use it. A column under our own name needs no
// proposal but is listed all the same. Where a table has magnitudes and distance moduli the magnitudes are
// proposed, as moduli of a release usually carry its own calibration.
func Recognise(header []string) map[string]string {
	found := make(map[string]string)
	for _, s := range spellings {
		if column, ok := spelled(header, s.ours, s.seen); ok {
			found[s.ours] = column
		}
	}
	if found["mag"] != "" {
		delete(found, "mu")
		delete(found, "mu_err")
	}
	return found
}

// spelled finds a column under our name, else under the first of its spellings that the header has.
func spelled(header []string, ours string, seen []string) (string, bool) {
	for _, h := range header {
		if h == ours {
			return h, true
		}
	}
	for _, s := range append([]string{ours}, seen...) {
		for _, h := range header {
			if strings.EqualFold(h, s) {
				return h, true
			}
		}
	}
	return "", false
}
