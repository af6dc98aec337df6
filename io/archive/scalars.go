package archive

import "reflect"

// take replaces v by a copy with 0 for each float64 that it reaches through exported fields, pointers and slices, and
// appends those numbers to scalars in the order of the types' fields. What v shares with others stays as it is. Taking
// all there are, by their type, means that a number which a report or an effect gets later cannot be forgotten.
func take[T any](v *T, scalars *[]float64) {
	*v = bare(reflect.ValueOf(*v), scalars).Interface().(T)
}

func bare(v reflect.Value, scalars *[]float64) reflect.Value {
	out := reflect.New(v.Type()).Elem()
	out.Set(v)
	switch v.Kind() {
	case reflect.Float64:
		*scalars = append(*scalars, v.Float())
		out.SetFloat(0)
	case reflect.Struct:
		for i := range v.NumField() {
			if out.Field(i).CanSet() {
				out.Field(i).Set(bare(v.Field(i), scalars))
			}
		}
	case reflect.Pointer:
		if !v.IsNil() {
			out.Set(reflect.New(v.Type().Elem()))
			out.Elem().Set(bare(v.Elem(), scalars))
		}
	case reflect.Slice:
		if v.IsNil() {
			break
		}
		out.Set(reflect.MakeSlice(v.Type(), v.Len(), v.Len()))
		for i := range v.Len() {
			out.Index(i).Set(bare(v.Index(i), scalars))
		}
	}
	return out
}

// give is the reverse of take for what p points to, in place: it uses up the first of scalars. It reports whether there
// were enough.
func give(p any, scalars *[]float64) bool { return fill(reflect.ValueOf(p).Elem(), scalars) }

func fill(v reflect.Value, scalars *[]float64) bool {
	switch v.Kind() {
	case reflect.Float64:
		if len(*scalars) == 0 {
			return false
		}
		v.SetFloat((*scalars)[0])
		*scalars = (*scalars)[1:]
	case reflect.Struct:
		for i := range v.NumField() {
			if v.Field(i).CanSet() && !fill(v.Field(i), scalars) {
				return false
			}
		}
	case reflect.Pointer:
		return v.IsNil() || fill(v.Elem(), scalars)
	case reflect.Slice:
		for i := range v.Len() {
			if !fill(v.Index(i), scalars) {
				return false
			}
		}
	}
	return true
}
