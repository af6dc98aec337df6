package observe

// JoinReport tells what a join came to, beside the rows set aside, which are in Table.Aside.
type JoinReport struct {
	Sides  []SideReport // in the order of Join.Sides
	Absent []string     // keys of the places that no row has, sorted
	Added  int          // rows added for such places
}

// SideReport tells how one side matched.
type SideReport struct {
	Source       string   // name of the table
	Matched      int      // rows of the observations whose key it has
	WithoutMatch []string // keys of the observations that it lacks, sorted
	Unused       []string // its keys that no row of the observations has, sorted
	WithoutKey   int      // its rows that have no key
	Alike        []Alike  // keys it lacks that are written almost like one that it has and that matches, by Key
}
