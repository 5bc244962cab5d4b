import mpmath as mp
mp.mp.dps=40
import random
random.seed(7)
out=[]
xs=[0.0,1e-300,1e-10,0.001,0.1,0.5,0.7,1.0,1.5,2.0,3.0,4.99,5.0,7.9999,8.0,8.5,12.0,20.0,30.0,37.5]+[random.uniform(0,37.5) for _ in range(60)]+[random.uniform(0,3) for _ in range(40)]
print("x,upper,log_upper,mills")
for x in xs:
    X=mp.mpf(x); q=mp.erfc(X/mp.sqrt(2))/2
    print("%r,%s,%s,%s"%(x,mp.nstr(q,20,min_fixed=0,max_fixed=0),mp.nstr(mp.log(q),20),mp.nstr(q/(mp.exp(-X*X/2)/mp.sqrt(2*mp.pi)),20)))
