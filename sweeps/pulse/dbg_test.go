package pulse
import ("testing";"math";"math/rand/v2";"fmt")
func TestDbg(t *testing.T){
	rng := rand.New(rand.NewPCG(1, 9))
	show:=func(name string, s specimen, r Result){
		out:=fmt.Sprintf("%-22s %s N %d ",name,r.Class,r.Periods)
		tr:=s.truth()
		for _,n:=range []string{"duty","period","high_level","low_level","average_voltage"} { q,ok:=r.Get(n); if ok { out+=fmt.Sprintf("%s z %.1f (u %.2g) ",n,(q.X-tr[n])/q.U(),q.U()/math.Abs(tr[n])) } }
		for _,f:=range r.Flags {out+="["+f.Name+"] "}
		t.Log(out)
	}
	base:=timer
	do:=func(name string, s specimen, f func(i int, v float64) float64){
		v:=s.wave(grid0(s.n,0,s.interval),rng)
		for i:=range v { v[i]=f(i,v[i]) }
		r,err:=Analyse(s.record(s.digitise(v,rng),0,s.interval),Options{})
		if err!=nil {t.Fatal(err)}
		show(name,s,r)
	}
	id:=func(i int,v float64)float64{return v}
	s:=base(); do("plain",s,id)
	do("spikes 20 V", s, func(i int,v float64)float64{ if i%97==5 {return v+7}; return v})
	do("brush spikes both", s, func(i int,v float64)float64{ if rng.IntN(50)==0 {return v+uniform(rng,-3,3)}; return v})
	do("hum 50Hz 3%", s, func(i int,v float64)float64{ return v+0.3*math.Sin(2*math.Pi*50*float64(i)*s.interval)})
	do("drift", s, func(i int,v float64)float64{ return v+0.5*float64(i)/1200})
	do("supply sag 10%", s, func(i int,v float64)float64{ return v*(1-0.1*float64(i)/1200)})
	s=base(); s.duty=0.004; s.n=60000; s.interval=1.003e-6; do("duty 0.4%",s,id)
	s=base(); s.duty=0.995; s.n=60000; s.interval=1.003e-6; do("duty 99.5%",s,id)
	s=base(); s.duty=.5; s.up,s.down=exponential(3e-4),exponential(3e-4); do("soft RC",s,id)
	s=base(); s.duty=.5; s.up,s.down=ramp(3.5e-4),ramp(3.5e-4); do("trapezoid",s,id)
	s=base(); s.up,s.down=ringing(3e-4,3e-4),ringing(3e-4,3e-4); do("slow ringing",s,id)
	s=base(); s.up,s.down=ringing(2e-5,2e-4),ringing(2e-5,2e-4); do("long ringing",s,id)
	s=base(); s.bits=16; s.span=20; s.bottom=-10; s.noise=.02; // 16 bit
	v:=s.wave(grid0(s.n,0,s.interval),rng); c:=make([]int16,len(v)); for i:=range v {c[i]=int16(math.Round((v[i]+.02*rng.NormFloat64())/20*65536))}
	r,_:=Analyse(Record{Codes:c,PerCode:20./65536,Interval:s.interval},Options{}); show("16 bit",s,r)
	s=base(); s.noise=.5; do("noise 6%",s,id)
	s=base(); s.noise=1; do("noise 11%",s,id)
	s=base(); s.low,s.freewheel,s.conduct=0.3,-.6,.5; do("stalled 3level",s,id)
	s=base(); s.low,s.freewheel,s.conduct=8.0,-.6,.4; do("fast motor 3level",s,id)
	s=base(); s.low,s.freewheel,s.conduct=5.0,-.6,.4; do("rest ripple",s,func(i int,v float64)float64{ if v>4.9&&v<5.1 {return v+.4*math.Sin(float64(i)/5)}; return v})
	s=base(); s.low,s.freewheel,s.conduct=5.0,-.6,.35; s.up=ringing(4e-5,4e-5); do("rest ringing",s,id)
	s=base(); s.low,s.freewheel,s.conduct=5.0,-.6,.33; do("short freewheel 3 smp",s,id)
	s=base(); s.low,s.freewheel,s.conduct=5.0,-.6,.35; s.n=100000; s.interval=1e-6; do("3level long",s,id)
	s=base(); do("alternating width", s, func(i int,v float64)float64{ return v})
	s=base(); s.sag=.05; do("sag 5%",s,id)
	s=base(); s.sag=.4; do("sag 40%",s,id)
}
