package gen

import "math/rand/v2"

// farmNames pairs invented first and second parts, each pair once, in random order.
func farmNames(r *rand.Rand) []string {
	first := []string{"Gorse", "Marsh", "Kestrel", "Ash", "Brack", "Cold", "Dun", "Fallow", "Haw", "Lark", "Nether", "Over", "Plover", "Reed", "Sand", "Tern", "Wether", "Withy", "Barley", "Moss"}
	second := []string{"wick", "ley", "by Farm", " Barton", " Croft", "stead", " Farm", " Hollow", "garth", " End"}
	var out []string
	for _, a := range first {
		for _, b := range second {
			out = append(out, a+b)
		}
	}
	r.Shuffle(len(out), func(i, j int) { out[i], out[j] = out[j], out[i] })
	return out
}

// people gives an invented owner's name.
func people(r *rand.Rand) string {
	given := []string{"Aldis", "Berrin", "Corra", "Dellan", "Edrith", "Fenna", "Garrow", "Hesper", "Ivo", "Jorun", "Kerren", "Lowen", "Merel", "Nessa", "Orrin", "Perran", "Quill", "Rhosyn", "Senna", "Tobin", "Ulla", "Veryan", "Wenna", "Ysolde"}
	family := []string{"Ackerlow", "Brandreth", "Colwyth", "Dunmoor", "Eskdaleth", "Farrowby", "Gullane", "Harrowend", "Isbister-Low", "Kettlemere", "Lanyon-Reed", "Marramer", "Netherby", "Ormthwaite", "Pellowe", "Quarrendon", "Rushbeck", "Saltreather", "Thrennick", "Underhay", "Velloway", "Whinfell"}
	return given[r.IntN(len(given))] + " " + family[r.IntN(len(family))]
}
