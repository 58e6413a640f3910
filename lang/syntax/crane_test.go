package syntax

// craneText is a whole design: the trolley of a vat crane, with its comments in one column.
const craneText = `# Trolley of a vat crane in a cellar: can the drive damp the swing, and with which gains?
model crane {
  given M = 1200 kg ± 5%              # trolley
  given m = 350 kg ± 40%              # hanging vat
  given l = 6 m ± 30%                 # rope
  given c = 95 N*s/m ± 20%            # rolling friction
  given g = 9.81 m/s^2
  input  F in N range 3000
  state  x in m range 10, v in m/s range 2, a in rad range 0.1, w in rad/s range 0.2
  output x, a
  let d = M + m*sin(a)^2
  rate x = v
  rate v = (F - c*v + m*sin(a)*(l*w^2 + g*cos(a))) / d
  rate a = w
  rate w = -(cos(a)*(F - c*v + m*l*w^2*sin(a)) + (M + m)*g*sin(a)) / (l*d)
  around rest
}
modes(crane)                                   # each mode: what moves it, what sees it
K = assign_poles(crane, [pole_pair(damping: 0.7, frequency: 1.1 rad/s), -0.9, -1.2])
characteristic_polynomial(closed(crane, K))
require least_damping(closed(crane, K)) >= 0.6, "swing decays well"
study swing = least_damping(closed(crane, K)) over crane samples 2000 seed 4 at corners
require swing >= 0.45
claim K is [[959.1, 2991, -1.881e4, -7694]]    # the numbers on a colleague's sheet
`

const craneTidy = `# Trolley of a vat crane in a cellar: can the drive damp the swing, and with which gains?
model crane {
  given M = 1200 kg ± 5%    # trolley
  given m = 350 kg ± 40%    # hanging vat
  given l = 6 m ± 30%       # rope
  given c = 95 N*s/m ± 20%  # rolling friction
  given g = 9.81 m/s^2
  input  F in N range 3000
  state  x in m range 10, v in m/s range 2, a in rad range 0.1, w in rad/s range 0.2
  output x, a
  let d = M + m*sin(a)^2
  rate x = v
  rate v = (F - c*v + m*sin(a)*(l*w^2 + g*cos(a))) / d
  rate a = w
  rate w = -(cos(a)*(F - c*v + m*l*w^2*sin(a)) + (M + m)*g*sin(a)) / (l*d)
  around rest
}
modes(crane)  # each mode: what moves it, what sees it
K = assign_poles(crane, [pole_pair(damping: 0.7, frequency: 1.1 rad/s), -0.9, -1.2])
characteristic_polynomial(closed(crane, K))
require least_damping(closed(crane, K)) >= 0.6, "swing decays well"
study swing = least_damping(closed(crane, K)) over crane samples 2000 seed 4 at corners
require swing >= 0.45
claim K is [[959.1, 2991, -1.881e4, -7694]]  # the numbers on a colleague's sheet
`

const notebookText = "---\ntitle: \"Swing of a vat\"\nauthor: A. N. Engineer\n\n# a remark\ndate: 2024-05-01\n---\n" + `
# Heading

Prose with ` + "`code`" + ` and a list:

` + "```gain" + `
M=1200 kg   # trolley
A=[[0 , 1],
[-2,-3]]
` + "```" + `

1. In an item:

   ` + "```gain title=second" + `

   model  c{
     given M=3 kg±5 %
   # inside


   state   x  in m
   output  y=x
   }

   ` + "```" + `

> ` + "~~~gain" + `
> z=1+
> 2
>
>
> w=f( a:3 ,b:-2 )
> ` + "~~~" + `

` + "```python\nno = this is not ours\n```\n\n```gainful\nnor this (\n```\n\n    ```gain\n    indented code is prose\n    ```\n\n```gain\n```\n\n```gain\n  \n```\n\n```gain\nlast=1\n```\n"
